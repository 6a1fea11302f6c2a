import { type UndampedModes, undampedModes } from "../fullorder/undamped-modes.js";
import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import { type PencilIndex, pencilIndex } from "../model/pencil-index.js";
import {
  type Definiteness,
  definitenessOf,
  emptyRows,
  ownFrequency,
  pencilValues,
  singularMotion,
  sumOfGroups,
} from "../model/structure-check.js";
import { analyse, type SymbolicAnalysis } from "../numerics/sparse/analysis.js";
import type { Problem, TermGroup } from "../problem/problem.js";
import type { CheckResult, DefinitenessRow } from "./check-result.js";
import type { CheckPoint } from "./check-samples.js";
import type { ReportProgress } from "./session.js";

export interface Assembled extends CheckPoint {
  readonly state: ModelState;
}

/** Factorisations made. */
export interface Counts {
  complex: number;
  real: number;
}

export interface Findings {
  readonly definiteness: CheckResult["definiteness"];
  readonly structure: CheckResult["structure"];
  readonly undamped: UndampedModes;
  readonly feedingTerms: boolean;
}

export const symmetricGroups = ["mass", "damping", "stiffness"] as const;

/** Up to this many dofs regularity is checked at every point, above at the nominal one. */
const mostForRegularityEverywhere = 1000;
const pencilGroups: readonly (readonly TermGroup[])[] = [
  ["mass"],
  ["damping", "gyroscopic", "frictional"],
  ["stiffness", "circulatory"],
];
const rank = { "positive definite": 0, zero: 1, "positive semidefinite": 1, indefinite: 2 };

/**
 * Everything found by factoring.
 *
 * @param points - the nominal one first; reading refuses factors that are not finite there, so that one is always left.
 */
export function findings(
  problem: Problem,
  model: ParametricModel,
  points: readonly Assembled[],
  allCorners: boolean,
  counts: Counts,
  progress: ReportProgress,
): Findings {
  const analysis = analyse(model.pattern);
  const definite = definitenessOver(model, analysis, points, allCorners, counts, progress);
  const nominal = points[0].state;
  progress({ stage: "index and regularity", done: 0, total: null });
  const structure = structureOf(model, analysis, points, definite.mass.rankDeficiency, counts);
  progress({ stage: "modes that no damping reaches", done: 0, total: null });
  const { bandHz } = problem.margin;
  const upper = bandHz === null ? null : 2 * Math.PI * bandHz[1];
  const sound = definite.mass.verdict !== "indefinite" && definite.damping.verdict !== "indefinite";
  const undamped = sound
    ? undampedModes(model, nominal, upper, model.order - definite.mass.rankDeficiency)
    : notSearched;
  counts.real += undamped.factorisations;
  const feeding = model.terms.map(({ group }) => group === "circulatory" || group === "frictional");
  const feedingTerms = points.some(({ state }) => feeding.some((is, k) => is && state.coefficients[k] !== 0));
  return { definiteness: definite, structure, undamped, feedingTerms };
}

const notSearched: UndampedModes = {
  count: null,
  omega: [],
  searchedTo: null,
  modesBelow: null,
  reason: "mass or damping is indefinite",
  factorisations: 0,
};

function definitenessOver(
  model: ParametricModel,
  analysis: SymbolicAnalysis,
  points: readonly Assembled[],
  allCorners: boolean,
  counts: Counts,
  progress: ReportProgress,
): CheckResult["definiteness"] {
  const total = symmetricGroups.length * points.length;
  const rowOf = (group: (typeof symmetricGroups)[number], turn: number): DefinitenessRow => {
    // A matrix is checked once for all points where it is the same but for a positive factor.
    const known = new Map<string, Definiteness>();
    const each = points.map(({ state }, k) => {
      progress({ stage: `definiteness of ${group}`, done: turn * points.length + k, total });
      const key = proportions(model, state, group);
      const found =
        known.get(key) ??
        definitenessOf(analysis, model.pattern, sumOfGroups(model, state.coefficients, [group]));
      if (!known.has(key)) counts.real += found.factorisations;
      known.set(key, found);
      return found;
    });
    const badness = (d: Definiteness) => rank[d.verdict] * (model.order + 1) + d.negative;
    const worst = each.reduce((most, d, k) => (badness(d) > badness(each[most]) ? k : most), 0);
    const alike = each.every(({ verdict }) => verdict === each[0].verdict);
    return {
      verdict: each[worst].verdict,
      negative: each[worst].negative,
      at: alike && each[worst].negative === 0 ? null : Object.fromEntries(points[worst].at),
      rankDeficiency: each[0].deficiency,
      proved: each.every(({ proved }) => proved),
    };
  };
  const [mass, damping, stiffness] = symmetricGroups.map(rowOf);
  return { mass, damping, stiffness, points: points.length, allCorners };
}

function proportions({ terms }: ParametricModel, { coefficients }: ModelState, group: TermGroup): string {
  const own = coefficients.filter((_, k) => terms[k].group === group);
  const largest = own.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
  // Rounded, so that a matrix merely scaled is recognised.
  return Array.from(own, (value) => (largest === 0 ? 0 : value / largest).toPrecision(13)).join(" ");
}

function structureOf(
  model: ParametricModel,
  analysis: SymbolicAnalysis,
  points: readonly Assembled[],
  deficiency: number,
  counts: Counts,
): CheckResult["structure"] {
  const { pattern, order } = model;
  const sums = ({ coefficients }: ModelState) =>
    pencilGroups.map((groups) => sumOfGroups(model, coefficients, groups));
  // Two values of s, since one of them may happen to be a real eigenvalue.
  const stuckAt = ({ state }: Assembled): Int32Array | null => {
    const [m, c, s] = sums(state);
    const frequency = ownFrequency(pattern, m, c, s);
    let stuck: Int32Array | null = null;
    for (const factor of [1, 0.37]) {
      counts.complex++;
      stuck = singularMotion(analysis, pattern, pencilValues(factor * frequency, m, c, s));
      if (stuck === null) break;
    }
    return stuck;
  };
  const checked = order <= mostForRegularityEverywhere ? points : points.slice(0, 1);
  let stuck: Int32Array | null = null;
  let at: Assembled | undefined;
  for (const point of checked) {
    stuck = stuckAt(point);
    if (stuck === null) continue;
    at = point;
    break;
  }
  const [m, c, s] = sums(points[0].state);
  const index: PencilIndex = pencilIndex(pattern, m, c, s, ownFrequency(pattern, m, c, s), deficiency);
  return {
    masslessDofs: emptyRows(pattern, m).reduce((sum, flag) => sum + flag, 0),
    massRankDeficiency: deficiency,
    index,
    regular: stuck === null,
    regularityPoints: checked.length,
    singularAt: at === undefined ? null : Object.fromEntries(at.at),
    undeterminedDofs: Array.from(stuck ?? [], (dof) => model.freeDofs[dof] + 1).sort((a, b) => a - b),
  };
}
