/** Eigenvalues of a symmetric pencil in an interval, by shift-and-invert block Lanczos. */

import { invariant } from "../../errors.js";
import { type DenseMatrix, zeros } from "../dense/matrix.js";
import type { Random } from "../random.js";
import { KrylovBasis, type RitzPairs, type ShiftInvertProblem } from "./krylov-basis.js";

export type { ShiftInvertProblem } from "./krylov-basis.js";

/** What to look for and how hard. */
export interface LanczosOptions {
  /** All λ in [lower, upper] are wanted, ends included. */
  readonly lower: number;
  readonly upper: number;
  /** Their number with multiplicity, from inertia; the search goes on until that many are found. */
  readonly expected: number;
  /** Columns per solve, at least 1. */
  readonly blockSize: number;
  /** Bound of ‖A x − θ x‖ / |θ| in the M-norm, A = (K − μM)⁻¹ M, θ = 1/(λ − μ). */
  readonly tolerance: number;
  /** The search ends before a block that would bring the columns solved for above this; a last check may take `expected` more. */
  readonly maximumSolves: number;
  readonly random: Random;
}

/** The pairs found. */
export interface LanczosResult {
  /** "incomplete" when fewer than `expected` converged within `maximumSolves`, or the range of M holds no more. */
  readonly status: "complete" | "incomplete";
  /** λ, ascending. */
  readonly values: Float64Array;
  /** M-orthonormal columns. */
  readonly vectors: DenseMatrix;
  /** Columns solved for. */
  readonly solves: number;
  /**
   * ‖A x − θ x‖ / |θ| as the recurrence tells it, plus eps·max|θ| / |θ| for its rounding: this
   * part alone may exceed the tolerance when μ almost hits an eigenvalue.
   */
  readonly residuals: Float64Array;
}

/**
 * Block Lanczos with full reorthogonalisation and thick restart on A = (K − μM)⁻¹ M,
 * which is self-adjoint in the M inner product. Start vectors are pushed through A, so the null space
 * of M (λ = ∞) never enters. One Krylov space holds at most `blockSize` copies of a
 * multiple eigenvalue: when nothing unconverged is left in the interval and eigenvalues
 * beyond it have appeared, the converged pairs are deflated and random vectors start anew.
 *
 * Cost: some two columns solved per eigenvalue and 8 n k² operations, k ≈ 2 expected + 40.
 *
 * @throws NumericalError `numerics.not-finite` when a solve overflows.
 *
 * Source: Grimes, Lewis & Simon, SIAM J. Matrix Anal. Appl. 15(1), 1994, pp. 228–272;
 * Stewart, SIAM J. Matrix Anal. Appl. 23(3), 2001, pp. 601–614 (restart).
 */
export function shiftInvertLanczos(problem: ShiftInvertProblem, options: LanczosOptions): LanczosResult {
  const { expected, maximumSolves } = options;
  invariant(options.blockSize >= 1, `block size ${options.blockSize}`);
  if (expected === 0) return emptyResult(problem.order, "complete", 0);
  const n = problem.order;
  const block = Math.min(options.blockSize, n);
  const capacity = Math.min(n, 2 * expected + 40 + 4 * block);
  const basis = new KrylovBasis(problem, block, capacity, options.random);
  const limit = keepLimit(capacity, block, n);
  // Before this size the wanted pairs cannot all have converged.
  let nextCheck = Math.min(capacity, Math.ceil(1.3 * expected) + block);
  let deflated = 0;
  for (;;) {
    const ended = basis.ahead === 0;
    const outOfSolves = basis.solves + basis.ahead > maximumSolves;
    const full = basis.size + basis.ahead > capacity;
    if (!(ended || outOfSolves || full || basis.size >= nextCheck)) {
      basis.expand();
      continue;
    }
    if (basis.size === 0) return emptyResult(n, "incomplete", basis.solves);
    const pairs = basis.ritzPairs();
    const state = classify(pairs, problem.shift, options);
    if (state.found.length >= expected || ended || outOfSolves) {
      return gather(basis, pairs, state, options);
    }
    if (state.copiesMissing && state.converged > deflated) {
      const done = state.order.filter((j) => state.isConverged[j]);
      basis.restartDeflated(pairs, done.slice(0, limit));
      deflated = basis.size;
    } else if (full) {
      basis.restart(pairs, state.order.slice(0, keptCount(state, capacity, limit)));
    }
    nextCheck = basis.size + Math.max(block, Math.ceil(0.08 * basis.size));
  }
}

interface RitzState {
  /** λ of each pair. */
  readonly lambda: Float64Array;
  readonly isConverged: readonly boolean[];
  readonly converged: number;
  /** Number of pairs in the interval, converged or not. */
  readonly inside: number;
  /** Converged pairs in the interval. */
  readonly found: readonly number[];
  /** Nothing in the interval is on its way, yet what lies beyond has arrived. */
  readonly copiesMissing: boolean;
  /** All pairs: those inside first, then by falling |θ|. */
  readonly order: readonly number[];
}

function classify(pairs: RitzPairs, shift: number, options: LanczosOptions): RitzState {
  const theta = pairs.eigen.values;
  const { tolerance, upper } = options;
  const lambda = theta.map((x) => shift + 1 / x);
  const all = Array.from(theta.keys());
  const isInside = all.map((j) => distanceOutside(lambda[j], options) <= slack(lambda[j], shift, tolerance));
  const isConverged = all.map((j) => pairs.residuals[j] <= tolerance * Math.abs(theta[j]));
  const isPast = (j: number): boolean => (upper > shift ? lambda[j] > upper : lambda[j] < options.lower);
  const arrivedBeyond = all.some(
    (j) => !isInside[j] && isPast(j) && pairs.residuals[j] <= Math.sqrt(tolerance) * Math.abs(theta[j]),
  );
  const rank = (j: number): number => (isInside[j] ? Number.POSITIVE_INFINITY : Math.abs(theta[j]));
  return {
    lambda,
    isConverged,
    converged: isConverged.filter(Boolean).length,
    inside: isInside.filter(Boolean).length,
    found: all.filter((j) => isInside[j] && isConverged[j]),
    copiesMissing: arrivedBeyond && all.every((j) => !isInside[j] || isConverged[j]),
    order: all.sort((i, j) => compare(rank(j), rank(i))),
  };
}

// Infinite ranks are equal; their difference would be NaN.
function compare(a: number, b: number): number {
  return a < b ? -1 : a > b ? 1 : 0;
}

function distanceOutside(lambda: number, { lower, upper }: LanczosOptions): number {
  return Math.max(lower - lambda, lambda - upper, 0);
}

/** An eigenvalue at an end of the interval may be computed this far beyond it. */
function slack(lambda: number, shift: number, tolerance: number): number {
  return tolerance * Math.abs(lambda - shift) + 8 * Number.EPSILON * Math.abs(lambda);
}

/** A restart leaves room for a few more blocks, unless the basis may fill the whole space anyway. */
function keepLimit(capacity: number, block: number, order: number): number {
  return capacity === order ? order : capacity - 3 * block;
}

function keptCount(state: RitzState, capacity: number, limit: number): number {
  return Math.min(limit, state.inside + Math.floor(Math.max(0, capacity - state.inside) / 2));
}

/** The found pairs, ascending; of more than expected those farthest outside the interval are left out. */
function gather(
  basis: KrylovBasis,
  pairs: RitzPairs,
  state: RitzState,
  options: LanczosOptions,
): LanczosResult {
  const { lambda } = state;
  const theta = pairs.eigen.values;
  const rounding = Number.EPSILON * Math.max(Math.abs(theta[0]), Math.abs(theta[theta.length - 1]));
  const outside = (j: number): number => distanceOutside(lambda[j], options);
  const byDistance = [...state.found].sort((i, j) => outside(i) - outside(j));
  const chosen = byDistance.filter((j, place) => place < options.expected || outside(j) === 0);
  chosen.sort((i, j) => lambda[i] - lambda[j]);
  const vectors = basis.purified(pairs, chosen, 10 * options.tolerance);
  return {
    status: chosen.length >= options.expected ? "complete" : "incomplete",
    values: Float64Array.from(chosen, (j) => lambda[j]),
    vectors,
    solves: basis.solves,
    residuals: Float64Array.from(chosen, (j) => (pairs.residuals[j] + rounding) / Math.abs(theta[j])),
  };
}

function emptyResult(order: number, status: LanczosResult["status"], solves: number): LanczosResult {
  return {
    status,
    values: new Float64Array(0),
    vectors: zeros(order, 0),
    solves,
    residuals: new Float64Array(0),
  };
}
