import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import { ownFrequency, sumOfGroups } from "../model/structure-check.js";
import { column } from "../numerics/dense/matrix.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { energyForm } from "./energy-form.js";
import { FullModel, type FullPencil } from "./full-model.js";
import { countModesBelow, naturalModes } from "./natural-modes.js";

/** The modes that no damping reaches, at one state. */
export interface UndampedModes {
  /** null when it could not be determined; `reason` says why. */
  readonly count: number | null;
  /** ω ≥ 0 [rad/s], ascending; fewer than `count` when there are too many to compute. */
  readonly omega: readonly number[];
  /** Real modes K x = ω²M x were searched up to here [rad/s]; null when none were. */
  readonly searchedTo: number | null;
  /** Number of all real modes up to there by inertia, damped or not; null without proof. */
  readonly modesBelow: number | null;
  readonly reason: string | null;
  readonly factorisations: number;
}

/** Without a band models up to this order are searched at all frequencies. */
export const mostWithoutBand = 300;
/** More modes than this are counted, not computed. */
const mostComputed = 200;
/** xᵀDx below this times ω xᵀMx counts as no damping. */
const undampedTolerance = 1e-12;

/**
 * Real modes K x = ω²M x with D x = 0 (tolerance: xᵀDx ≤ 1e-12 ω xᵀMx): without gyroscopic and feeding terms they
 * lie on the imaginary axis whatever the dashpots are. Gyroscopic coupling, which may bring them into contact
 * with damping, is ignored.
 *
 * They are the same for K + τD as for K, whatever τ > 0: so a large τ lifts the damped modes out of the
 * way (a dashpot that sees a combination of equal modes splits them), keeps massless dofs held by dashpots alone regular, and few modes are left to compute.
 * M, D ≥ 0 is assumed. Some five real factorisations.
 *
 * @param upperOmega - upper end of the search [rad/s]; null: all frequencies, for at most 300 dofs.
 * @param massRank - number of positive eigenvalues of M.
 */
export function undampedModes(
  model: ParametricModel,
  state: ModelState,
  upperOmega: number | null,
  massRank: number,
): UndampedModes {
  const none = { count: 0, omega: [], searchedTo: null, modesBelow: 0, reason: null, factorisations: 0 };
  if (massRank === 0) return none;
  if (upperOmega === null && model.order > mostWithoutBand) {
    return { ...none, count: null, modesBelow: null, reason: "needs margin.bandHz above 300 free dofs" };
  }
  const { coefficients } = state;
  const damping = sumOfGroups(model, coefficients, ["damping"]).values;
  const plain = new FullModel(model);
  const plainPencil = plain.pencilAt(state);
  const upper = upperOmega ?? aboveAllModes(plainPencil, massRank, startFrequency(model, coefficients));
  if (upper === null) {
    const reason = "the real modes could not be counted";
    return { ...none, count: null, modesBelow: null, reason, factorisations: plain.counts.real };
  }
  const modesBelow = provenCount(plainPencil, upper);
  const lifted = liftedModel(model, state, 1e4 * upper);
  const full = new FullModel(lifted.model);
  const found = searchLifted(full.pencilAt(lifted.state), plainPencil, damping, upper);
  const factorisations = plain.counts.real + full.counts.real;
  return { ...found, searchedTo: upper, modesBelow, factorisations };
}

/** Modes below ω; null unless K + ω²M is definite, for only then the inertia of K − ω²M counts nothing but modes. */
function provenCount(pencil: FullPencil, omega: number): number | null {
  const { count, reliable } = countModesBelow(pencil, omega);
  const { inertia, inertiaReliable } = pencil.factorUndamped(-omega * omega);
  return reliable && inertiaReliable && inertia.negative === 0 ? count : null;
}

/** The model with K + τD in place of K. */
function liftedModel(model: ParametricModel, state: ModelState, tau: number) {
  const isDamping = model.terms.map(({ group }) => group === "damping");
  const terms = model.terms.map((term, k) =>
    isDamping[k] ? { ...term, group: "stiffness" as const } : term,
  );
  const coefficients = state.coefficients.map((value, k) => (isDamping[k] ? tau * value : value));
  return { model: { ...model, terms }, state: { ...state, coefficients } };
}

type Found = Pick<UndampedModes, "count" | "omega" | "reason">;

function searchLifted(lifted: FullPencil, plain: FullPencil, damping: Float64Array, upper: number): Found {
  const undetermined = (reason: string): Found => ({ count: null, omega: [], reason });
  const { count, reliable } = countModesBelow(lifted, upper);
  if (!reliable) return undetermined("the real modes could not be counted");
  if (count === 0) return { count: 0, omega: [], reason: null };
  const undampedModel = damping.every((value) => value === 0);
  if (count > mostComputed) {
    return undampedModel
      ? { count, omega: [], reason: null }
      : undetermined(`${count} weakly damped modes are too many to look through`);
  }
  const energy = energyForm(lifted, 0.3 * upper);
  if (!energy.definite) return undetermined("K + σM is indefinite or singular for every σ tried");
  const modes = naturalModes(lifted, upper, energy, count);
  if (!modes.complete) return undetermined("not all real modes could be computed");
  const matrix: SparseMatrix = { ...plain.stiffnessMatrix, values: damping };
  const omega = Array.from(modes.lambda.keys())
    .map((j) => undampedFrequency(column(modes.vectors, j), plain.stiffnessMatrix, matrix, upper))
    .filter((each) => each !== null);
  return { count: omega.length, omega: omega.sort((a, b) => a - b), reason: null };
}

/** ω of an undamped mode (M-normalised) by its Rayleigh quotient; null for a damped one and where xᵀKx < 0, no oscillation. */
function undampedFrequency(
  x: Float64Array,
  stiffness: SparseMatrix,
  damping: SparseMatrix,
  upper: number,
): number | null {
  const k = quadratic(stiffness, x);
  // A rigid motion has no ω of its own: a thousandth of the search's upper end stands in.
  const omega = Math.max(Math.sqrt(Math.max(0, k.value)), 1e-3 * upper);
  const d = quadratic(damping, x);
  if (Math.abs(d.value) > undampedTolerance * omega + d.rounding || k.value < -k.rounding) return null;
  return k.value <= k.rounding ? 0 : Math.sqrt(k.value);
}

/** xᵀAx, and what rounding may leave of it where it vanishes. */
function quadratic(a: SparseMatrix, x: Float64Array): { value: number; rounding: number } {
  let value = 0;
  let size = 0;
  for (let j = 0; j < a.cols; j++) {
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) {
      const part = x[a.rowIndex[p]] * a.values[p] * x[j];
      value += part;
      size += Math.abs(part);
    }
  }
  return { value, rounding: 64 * Number.EPSILON * size };
}

function startFrequency(model: ParametricModel, coefficients: Float64Array): number {
  const sum = (group: "mass" | "damping" | "stiffness") => sumOfGroups(model, coefficients, [group]);
  return ownFrequency(model.pattern, sum("mass"), sum("damping"), sum("stiffness"));
}

/** A frequency above every real mode: there K − ω²M has at least as many negative eigenvalues as M has positive ones. */
function aboveAllModes(pencil: FullPencil, massRank: number, start: number): number | null {
  let omega = start;
  for (let attempt = 0; attempt < 40; attempt++) {
    if (pencil.factorUndamped(omega * omega).inertia.negative >= massRank) return 2 * omega;
    omega *= 2;
  }
  return null;
}
