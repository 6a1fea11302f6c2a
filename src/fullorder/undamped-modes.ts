import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import { type GroupSum, ownFrequency, sumOfGroups } from "../model/structure-check.js";
import { column, type DenseMatrix, zeros } from "../numerics/dense/matrix.js";
import { symmetricEigen } from "../numerics/dense/symmetric-eigen.js";
import { multiplyAddInto, type SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
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
/** Modes closer than this, relative, are mixed freely before they are judged. */
const clusterGap = 1e-7;

/**
 * Real modes K x = ω²M x with D x = 0 (tolerance: xᵀDx ≤ 1e-12 ω xᵀMx): without gyroscopic and feeding terms they
 * lie on the imaginary axis whatever the dashpots are. Gyroscopic coupling, which may bring them into contact
 * with damping, is ignored.
 *
 * They are the same for K + τD as for K, whatever τ > 0: so a large τ lifts the damped modes out of the
 * way, keeps massless dofs held by dashpots alone regular, and few modes are left to compute.
 * M, D ≥ 0 is assumed. Some four real factorisations.
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
  const damping = sumOfGroups(model, coefficients, ["damping"]);
  const plain = new FullModel(model);
  const plainPencil = plain.pencilAt(state);
  const upper = upperOmega ?? aboveAllModes(plainPencil, massRank, startFrequency(model, coefficients));
  if (upper === null) {
    const reason = "the real modes could not be counted";
    return { ...none, count: null, modesBelow: null, reason, factorisations: plain.counts.real };
  }
  const below = countModesBelow(plainPencil, upper);
  const modesBelow = below.reliable ? below.count : null;
  const lifted = liftedModel(model, state, 1e4 * upper);
  const full = new FullModel(lifted.model);
  const found = searchLifted(full.pencilAt(lifted.state), plainPencil, damping, upper);
  const factorisations = plain.counts.real + full.counts.real;
  return { ...found, searchedTo: upper, modesBelow, factorisations };
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

function searchLifted(lifted: FullPencil, plain: FullPencil, damping: GroupSum, upper: number): Found {
  const undetermined = (reason: string): Found => ({ count: null, omega: [], reason });
  const { count, reliable } = countModesBelow(lifted, upper);
  if (!reliable) return undetermined("the real modes could not be counted");
  if (count === 0) return { count: 0, omega: [], reason: null };
  const undampedModel = damping.values.every((value) => value === 0);
  if (count > mostComputed) {
    return undampedModel
      ? { count, omega: [], reason: null }
      : undetermined(`${count} weakly damped modes are too many to look through`);
  }
  const energy = energyForm(lifted, 0.3 * upper);
  if (!energy.definite) return undetermined("K + σM is indefinite or singular for every σ tried");
  const modes = naturalModes(lifted, upper, energy, count);
  if (!modes.complete) return undetermined("not all real modes could be computed");
  const matrix: SparseMatrix = { ...plain.stiffnessMatrix, values: damping.values };
  const moduli: SparseMatrix = { ...matrix, values: damping.moduli };
  const omega = clusters(modes.lambda, energy.sigma).flatMap(([from, to]) =>
    undampedInCluster(modes.vectors, from, to, plain.stiffnessMatrix, matrix, moduli, upper),
  );
  return { count: omega.length, omega: omega.sort((a, b) => a - b), reason: null };
}

/** Ranges [from, to) of eigenvalues that cannot be told apart. */
function clusters(lambda: Float64Array, sigma: number): [number, number][] {
  const ranges: [number, number][] = [];
  lambda.forEach((value, j) => {
    const last = ranges[ranges.length - 1];
    const isClose = j > 0 && value - lambda[j - 1] <= clusterGap * Math.abs(value) + 1e-9 * sigma;
    if (last !== undefined && isClose) last[1] = j + 1;
    else ranges.push([j, j + 1]);
  });
  return ranges;
}

/**
 * Frequencies of the undamped combinations of M-orthonormal modes from … to − 1: the kernel of XᵀDX, and XᵀKX on it.
 * Modes of negative λ, which are not oscillations, are left out.
 */
function undampedInCluster(
  vectors: DenseMatrix,
  from: number,
  to: number,
  stiffness: SparseMatrix,
  damping: SparseMatrix,
  dampingModuli: SparseMatrix,
  upper: number,
): number[] {
  const modes = Array.from({ length: to - from }, (_, j) => column(vectors, from + j));
  const k = compress(stiffness, modes);
  const d = compress(damping, modes);
  const typical = Math.sqrt(Math.max(0, k.values[0]));
  // A rigid motion has no ω of its own: the search's upper end stands in, scaled down to where rounding reaches.
  const floor = undampedTolerance * Math.max(typical, 1e-3 * upper);
  const rounding = roundingOf(dampingModuli, modes);
  const eigen = symmetricEigen(d);
  const kernel = modes.map((_, j) => j).filter((j) => Math.abs(eigen.values[j]) <= floor + rounding);
  const combined = kernel.map((j) => combination(modes, column(eigen.vectors, j)));
  if (combined.length === 0) return [];
  const zero = roundingOf(stiffness, combined);
  const lambda = [...symmetricEigen(compress(stiffness, combined)).values];
  return lambda.filter((value) => value >= -zero).map((value) => (value <= zero ? 0 : Math.sqrt(value)));
}

/** What rounding may leave of a vanishing xᵀAx. */
function roundingOf(a: SparseMatrix, vectors: readonly Float64Array[]): number {
  const moduli = { ...a, values: a.values.map(Math.abs) };
  const sizes = vectors.map((x) => compress(moduli, [x.map(Math.abs)]).values[0]);
  return 64 * Number.EPSILON * Math.max(...sizes);
}

/** XᵀAX. */
function compress(a: SparseMatrix, vectors: readonly Float64Array[]): DenseMatrix {
  const out = zeros(vectors.length, vectors.length);
  vectors.forEach((x, j) => {
    const ax = new Float64Array(x.length);
    multiplyAddInto(ax, 1, a, x);
    vectors.forEach((y, i) => {
      let sum = 0;
      for (let p = 0; p < y.length; p++) sum += y[p] * ax[p];
      out.values[i + j * vectors.length] = sum;
    });
  });
  return out;
}

function combination(vectors: readonly Float64Array[], weights: Float64Array): Float64Array {
  const out = new Float64Array(vectors[0].length);
  vectors.forEach((x, k) => {
    for (let i = 0; i < out.length; i++) out[i] += weights[k] * x[i];
  });
  return out;
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
