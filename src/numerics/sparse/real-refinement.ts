/**
 * The real symmetric counterpart of `complex-refinement.ts`: solves with a factorisation and
 * refines each column until its backward error is negligible or no longer falls.
 *
 * Source: Skeel, Math. Comp. 35(151), 1980 (one correction usually suffices).
 */

import { invariant, NumericalError } from "../../errors.js";
import { column, type DenseMatrix, zeros } from "../dense/matrix.js";
import {
  BACKWARD_ERROR_GOAL,
  backwardErrorOf,
  MOST_REFINEMENTS,
  type SolveReport,
  STAGNATION,
} from "./backward-error.js";
import { subtractFourTransposed } from "./real-sparse-products.js";
import { multiplyTransposedAddInto, type SparseMatrix } from "./sparse-matrix.js";

/** Columns that share a pass over the matrix. */
const SHARED_COLUMNS = 4;

export class RealRefinement {
  private readonly a: SparseMatrix;
  private readonly ones: Float64Array;
  private readonly scale: Float64Array;
  private readonly inverseScale: Float64Array;
  private readonly normOfA: number;
  private readonly scaledNormOfA: number;

  /**
   * @param a - Symmetric, both triangles stored.
   * @param scale - The diagonal of D that equilibrates D A D.
   */
  constructor(a: SparseMatrix, scale: Float64Array) {
    this.a = a;
    this.ones = new Float64Array(scale.length).fill(1);
    this.scale = scale;
    this.inverseScale = scale.map((d) => 1 / d);
    this.normOfA = matrixNorm(a, this.ones);
    this.scaledNormOfA = matrixNorm(a, scale);
  }

  /**
   * B ← A⁻¹ B.
   *
   * @param apply - Overwrites its argument (n×any) with the unrefined solution.
   * @throws NumericalError `numerics.singular` when a solution is not finite.
   */
  solve(b: DenseMatrix, apply: (x: DenseMatrix) => void): SolveReport {
    invariant(b.rows === this.a.rows, `solve: ${b.rows} rows for an order of ${this.a.rows}`);
    const given = { rows: b.rows, cols: b.cols, values: b.values.slice() };
    apply(b);
    const residual = zeros(b.rows, b.cols);
    const error = new Float64Array(b.cols);
    for (let c = 0; c < b.cols; c += SHARED_COLUMNS) {
      this.residualInto(residual, b, given, c, Math.min(SHARED_COLUMNS, b.cols - c));
    }
    for (let c = 0; c < b.cols; c++) error[c] = this.columnError(residual, b, given, c);
    let open = Array.from(error.keys()).filter((c) => error[c] > BACKWARD_ERROR_GOAL);
    let refinements = 0;
    while (open.length > 0 && refinements < MOST_REFINEMENTS) {
      open = this.refineColumns(open, b, given, residual, error, apply);
      refinements++;
    }
    return { backwardError: error.reduce((a, e) => Math.max(a, e), 0), refinements };
  }

  /** Corrects these columns where that helps; returns those that deserve another correction. */
  private refineColumns(
    open: number[],
    x: DenseMatrix,
    b: DenseMatrix,
    residual: DenseMatrix,
    error: Float64Array,
    apply: (x: DenseMatrix) => void,
  ): number[] {
    const correction = zeros(x.rows, open.length);
    for (let t = 0; t < open.length; t++) column(correction, t).set(column(residual, open[t]));
    apply(correction);
    return open.filter((c, t) => {
      const xc = column(x, c);
      const before = xc.slice();
      const step = column(correction, t);
      for (let i = 0; i < xc.length; i++) xc[i] += step[i];
      const old = error[c];
      this.residualInto(residual, x, b, c, 1);
      error[c] = this.columnError(residual, x, b, c);
      if (error[c] >= old) {
        xc.set(before);
        error[c] = old;
        return false;
      }
      return error[c] > BACKWARD_ERROR_GOAL && error[c] <= STAGNATION * old;
    });
  }

  /** R ← B − A X in these columns; A is its own transpose, so nothing need be scattered. */
  private residualInto(
    residual: DenseMatrix,
    x: DenseMatrix,
    b: DenseMatrix,
    first: number,
    count: number,
  ): void {
    const columns = Array.from({ length: count }, (_, t) => column(x, first + t));
    const sums = columns.map((_, t) => column(residual, first + t));
    for (let t = 0; t < count; t++) sums[t].set(column(b, first + t));
    if (count === SHARED_COLUMNS) subtractFourTransposed(this.a, columns, sums);
    else for (let t = 0; t < count; t++) multiplyTransposedAddInto(sums[t], -1, this.a, columns[t]);
  }

  /** Backward error of a column from its residual. */
  private columnError(residual: DenseMatrix, x: DenseMatrix, b: DenseMatrix, c: number): number {
    const r = column(residual, c);
    const { ones, scale, inverseScale } = this;
    const normX = maxNorm(column(x, c), ones);
    const normB = maxNorm(column(b, c), ones);
    const error = backwardErrorOf(maxNorm(r, ones), this.normOfA, normX, normB);
    const scaledError = backwardErrorOf(
      maxNorm(r, scale),
      this.scaledNormOfA,
      maxNorm(column(x, c), inverseScale),
      maxNorm(column(b, c), scale),
    );
    if (!Number.isFinite(normX) || !Number.isFinite(error) || !Number.isFinite(scaledError)) {
      throw new NumericalError(
        "numerics.singular",
        `column ${c} of the solution is not finite (right-hand side of norm ${normB.toExponential(2)})`,
        "The matrix is singular or its entries span too wide a range; check supports, units and massless dofs.",
      );
    }
    return Math.max(error, scaledError);
  }
}

/** Largest weighted modulus; NaN when an entry is. */
function maxNorm(x: Float64Array, weight: Float64Array): number {
  let largest = 0;
  for (let i = 0; i < x.length; i++) {
    const modulus = Math.abs(x[i]) * weight[i];
    if (modulus > largest) largest = modulus;
    else if (Number.isNaN(modulus)) return Number.NaN;
  }
  return largest;
}

/** Infinity norm of D A D with D = diag(scale) and A symmetric. */
function matrixNorm(a: SparseMatrix, scale: Float64Array): number {
  let largest = 0;
  for (let j = 0; j < a.cols; j++) {
    let sum = 0;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++)
      sum += Math.abs(a.values[p]) * scale[a.rowIndex[p]];
    largest = Math.max(largest, sum * scale[j]);
  }
  return largest;
}
