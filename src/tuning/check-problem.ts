import { buildModel, type ModelState, type ParametricModel, stateAt } from "../model/parametric-model.js";
import { measuredAsymmetry } from "../model/structure-check.js";
import type { Problem } from "../problem/problem.js";
import { type Assembled, type Counts, findings, symmetricGroups } from "./check-findings.js";
import type { CheckResult, TermRow } from "./check-result.js";
import { checkPoints } from "./check-samples.js";
import { describedPoint, doubtsOf, warningsOf } from "./check-verdict.js";
import { cautions } from "./result.js";
import type { ReportProgress } from "./session.js";
import { unitsOf } from "./units.js";

export type { CheckResult, DefinitenessRow, TermRow } from "./check-result.js";

export interface CheckOptions {
  /** Version of the program, for the record. */
  readonly version: string;
  /** Random points checked besides nominal point and corners; default 8. */
  readonly samples?: number;
}

/**
 * Whether a model is sound: sizes, symmetry, definiteness of M, D and K over design box and envelope by inertia,
 * index, regularity, and what its structure says about stability without the feeding terms.
 *
 * `status` is `unsound` when M or D is indefinite, a factor is not a finite number somewhere, or
 * the pencil is singular; an indefinite K withdraws the structural guarantee and is a warning.
 *
 * @throws InputError when no dof is free.
 */
export function checkProblem(problem: Problem, options: CheckOptions, progress: ReportProgress): CheckResult {
  const began = Date.now();
  progress({ stage: "building the model", done: 0, total: null });
  const model = buildModel(problem);
  const { points, allCorners } = checkPoints(problem, options.samples ?? 8);
  const assembled = points.map((point) => ({
    ...point,
    state: stateAt(model, new Map([...problem.constants, ...point.at])),
  }));
  const doubts = undefinedFactors(model, assembled);
  const finite = assembled.filter(({ state }) => state.coefficients.every(Number.isFinite));
  const counts: Counts = { complex: 0, real: 0 };
  const found = findings(problem, model, finite, allCorners, counts, progress);
  doubts.push(...doubtsOf(found));
  const { undamped, definiteness } = found;
  const searchedToHz = undamped.searchedTo === null ? null : undamped.searchedTo / (2 * Math.PI);
  return {
    format: "dampwright-result/1",
    command: "check",
    version: options.version,
    title: problem.title,
    units: unitsOf(problem),
    status: doubts.length === 0 ? "trusted" : "unsound",
    sizes: {
      dofs: problem.dofs,
      fixed: problem.fixed.length,
      free: model.order,
      nonzeros: model.pattern.rowIndex.length,
    },
    terms: termRows(problem, model, assembled[0].state),
    definiteness,
    structure: found.structure,
    stability: {
      feedingTerms: found.feedingTerms,
      stableByStructure:
        finite.length === assembled.length &&
        found.structure.regular &&
        symmetricGroups.every((g) => definiteness[g].verdict !== "indefinite" && definiteness[g].proved),
      undamped: {
        count: undamped.count,
        frequenciesHz: undamped.omega.slice(0, 20).map((omega) => omega / (2 * Math.PI)),
        searchedToHz,
        reason: undamped.reason,
      },
    },
    doubts,
    warnings: warningsOf(found),
    cautions,
    model: { dofs: model.order, modesCounted: undamped.modesBelow, searchedToHz },
    effort: {
      factorisations: counts.complex + counts.real,
      complexFactorisations: counts.complex,
      realFactorisations: counts.real,
      factorisationsBeforeAudit: null,
      reducedOrder: 0,
      reducedEvaluations: 0,
      seconds: (Date.now() - began) / 1000,
    },
    inputs: problem.inputs,
  };
}

function termRows({ terms }: Problem, model: ParametricModel, { coefficients }: ModelState): TermRow[] {
  return model.terms.map(({ name, group, matrix }, k) => ({
    name,
    group,
    matrix: terms[k].matrix,
    nonzeros: matrix.values.length,
    factor: coefficients[k],
    asymmetry: measuredAsymmetry(matrix, group === "gyroscopic" ? -1 : 1),
  }));
}

function undefinedFactors({ terms }: ParametricModel, points: readonly Assembled[]): string[] {
  return terms.flatMap(({ name, factor }, k) => {
    const point = points.find(({ state }) => !Number.isFinite(state.coefficients[k]));
    if (point === undefined) return [];
    const value = point.state.coefficients[k];
    return [
      `The factor ${factor.text} of term "${name}" is ${value} at ${describedPoint(point.at)}. Correct the formula or the ranges.`,
    ];
  });
}
