/**
 * Solves with a factorisation and refines each column until its backward error is negligible
 * or no longer falls.
 *
 * Source: Skeel, Math. Comp. 35(151), 1980 (one correction usually suffices).
 */

import { invariant, NumericalError } from "../../errors.js";
import { type ComplexMatrix, complexZeros } from "../dense/matrix.js";
import {
  BACKWARD_ERROR_GOAL,
  backwardErrorOf,
  MOST_REFINEMENTS,
  type SolveReport,
  STAGNATION,
} from "./backward-error.js";
import type { ComplexValues, SparsePattern } from "./sparse-matrix.js";

export class ComplexRefinement {
  private readonly pattern: SparsePattern;
  private readonly values: ComplexValues;
  private readonly normOfA: number;
  private readonly normOfAdjoint: number;

  constructor(pattern: SparsePattern, values: ComplexValues) {
    this.pattern = pattern;
    this.values = values;
    const rowSum = new Float64Array(pattern.rows);
    let largestColumn = 0;
    for (let j = 0; j < pattern.cols; j++) {
      let columnSum = 0;
      for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) {
        const modulus = Math.sqrt(values.re[p] * values.re[p] + values.im[p] * values.im[p]);
        columnSum += modulus;
        rowSum[pattern.rowIndex[p]] += modulus;
      }
      largestColumn = Math.max(largestColumn, columnSum);
    }
    this.normOfAdjoint = largestColumn;
    this.normOfA = rowSum.reduce((a, b) => Math.max(a, b), 0);
  }

  /**
   * B ← A⁻¹ B, or A⁻ᴴ B when `adjoint`.
   *
   * @param apply - Overwrites its argument (n×any) with the unrefined solution.
   * @throws NumericalError `numerics.singular` when a solution is not finite.
   */
  solve(b: ComplexMatrix, adjoint: boolean, apply: (x: ComplexMatrix) => void): SolveReport {
    invariant(b.rows === this.pattern.rows, `solve: ${b.rows} rows for an order of ${this.pattern.rows}`);
    const given = { rows: b.rows, cols: b.cols, re: b.re.slice(), im: b.im.slice() };
    apply(b);
    const residual = complexZeros(b.rows, b.cols);
    const error = new Float64Array(b.cols);
    for (let c = 0; c < b.cols; c++) error[c] = this.columnError(residual, b, given, c, adjoint);
    let open = columnsAbove(error);
    let refinements = 0;
    while (open.length > 0 && refinements < MOST_REFINEMENTS) {
      open = this.refineColumns(open, b, given, residual, error, adjoint, apply);
      refinements++;
    }
    return { backwardError: error.reduce((a, e) => Math.max(a, e), 0), refinements };
  }

  /** Corrects these columns where that helps; returns those that deserve another correction. */
  private refineColumns(
    open: number[],
    x: ComplexMatrix,
    b: ComplexMatrix,
    residual: ComplexMatrix,
    error: Float64Array,
    adjoint: boolean,
    apply: (x: ComplexMatrix) => void,
  ): number[] {
    const n = x.rows;
    const correction = complexZeros(n, open.length);
    const before = complexZeros(n, open.length);
    for (let t = 0; t < open.length; t++) {
      copyColumn(correction, t, residual, open[t]);
      copyColumn(before, t, x, open[t]);
    }
    apply(correction);
    return open.filter((c, t) => {
      for (let i = 0; i < n; i++) {
        x.re[i + c * n] += correction.re[i + t * n];
        x.im[i + c * n] += correction.im[i + t * n];
      }
      const old = error[c];
      error[c] = this.columnError(residual, x, b, c, adjoint);
      if (error[c] >= old) {
        copyColumn(x, c, before, t);
        error[c] = old;
        return false;
      }
      return error[c] > BACKWARD_ERROR_GOAL && error[c] <= STAGNATION * old;
    });
  }

  /** Leaves the residual in its column and returns the backward error. */
  private columnError(
    residual: ComplexMatrix,
    x: ComplexMatrix,
    b: ComplexMatrix,
    c: number,
    adjoint: boolean,
  ): number {
    copyColumn(residual, c, b, c);
    if (adjoint) this.subtractAdjointProduct(residual, x, c);
    else this.subtractProduct(residual, x, c);
    const normX = columnNorm(x, c);
    const normB = columnNorm(b, c);
    const normA = adjoint ? this.normOfAdjoint : this.normOfA;
    const error = backwardErrorOf(columnNorm(residual, c), normA, normX, normB);
    if (!Number.isFinite(normX) || !Number.isFinite(error)) {
      throw new NumericalError(
        "numerics.singular",
        `column ${c} of the solution is not finite (right-hand side of norm ${normB.toExponential(2)})`,
        "The matrix is singular or its entries span too wide a range; check supports, units and massless dofs.",
      );
    }
    return error;
  }

  private subtractProduct(r: ComplexMatrix, x: ComplexMatrix, c: number): void {
    const { cols, rows, colStart, rowIndex } = this.pattern;
    const { re: aRe, im: aIm } = this.values;
    const { re: rRe, im: rIm } = r;
    const shift = c * rows;
    for (let j = 0; j < cols; j++) {
      const xr = x.re[shift + j];
      const xi = x.im[shift + j];
      for (let p = colStart[j]; p < colStart[j + 1]; p++) {
        const i = shift + rowIndex[p];
        rRe[i] -= aRe[p] * xr - aIm[p] * xi;
        rIm[i] -= aRe[p] * xi + aIm[p] * xr;
      }
    }
  }

  private subtractAdjointProduct(r: ComplexMatrix, x: ComplexMatrix, c: number): void {
    const { cols, rows, colStart, rowIndex } = this.pattern;
    const { re: aRe, im: aIm } = this.values;
    const { re: xRe, im: xIm } = x;
    const shift = c * rows;
    for (let j = 0; j < cols; j++) {
      let sumRe = 0;
      let sumIm = 0;
      for (let p = colStart[j]; p < colStart[j + 1]; p++) {
        const i = shift + rowIndex[p];
        sumRe += aRe[p] * xRe[i] + aIm[p] * xIm[i];
        sumIm += aRe[p] * xIm[i] - aIm[p] * xRe[i];
      }
      r.re[shift + j] -= sumRe;
      r.im[shift + j] -= sumIm;
    }
  }
}

function columnsAbove(error: Float64Array): number[] {
  return Array.from(error.keys()).filter((c) => error[c] > BACKWARD_ERROR_GOAL);
}

function copyColumn(target: ComplexMatrix, to: number, source: ComplexMatrix, from: number): void {
  const n = source.rows;
  target.re.set(source.re.subarray(from * n, (from + 1) * n), to * n);
  target.im.set(source.im.subarray(from * n, (from + 1) * n), to * n);
}

/** Largest modulus in column c; NaN or infinite when an entry is. */
function columnNorm(x: ComplexMatrix, c: number): number {
  let largest = 0;
  for (let i = c * x.rows; i < (c + 1) * x.rows; i++) {
    const square = x.re[i] * x.re[i] + x.im[i] * x.im[i];
    // Written so that a NaN is kept.
    if (!(square <= largest)) largest = square;
    if (Number.isNaN(square)) return Number.NaN;
  }
  return Math.sqrt(largest);
}
