/** Real dense LU factors; `complex-lu.ts` has the complex ones, exported here as well. */

import { invariant } from "../../errors.js";
import { addProductInto, type Block } from "./block-kernels.js";
import { requireFiniteMaximum } from "./finite.js";
import type { DenseMatrix } from "./matrix.js";

export { type ComplexDenseLu, factorDenseComplex } from "./complex-lu.js";

/** P A = L U of a square matrix, ready to solve. */
export interface DenseLu {
  readonly order: number;
  /**
   * Smallest over largest pivot modulus as met, before any replacement:
   * 1 for the identity, near eps or 0 for a matrix singular to working accuracy; 1 for order 0.
   */
  readonly pivotRatio: number;
  /** b ← A⁻¹ b for every column of b. */
  solveInPlace(b: DenseMatrix): void;
}

const panelWidth = 16;

/**
 * Factors A by Gaussian elimination with partial pivoting, blocked by columns.
 * Pivots below eps·max|a| are replaced by that value (by eps for A = 0), so a
 * solve always ends and grows along the null vectors, as inverse iteration needs.
 *
 * @param a - A, n×n, unchanged.
 * @throws NumericalError `numerics.not-finite`.
 */
export function factorDense(a: DenseMatrix): DenseLu {
  invariant(a.rows === a.cols, `LU of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const floor = Number.EPSILON * (requireFiniteMaximum(a.values, "A matrix to be factored") || 1);
  const lu = Float64Array.from(a.values);
  const pivotRow = new Int32Array(n);
  let smallest = Number.POSITIVE_INFINITY;
  let largest = 0;
  for (let begin = 0; begin < n; begin += panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    for (let j = begin; j < end; j++) {
      const pivot = eliminateColumn(lu, n, j, end, floor, pivotRow);
      smallest = Math.min(smallest, pivot);
      largest = Math.max(largest, pivot);
    }
    updateRight(lu, n, begin, end);
  }
  return {
    order: n,
    pivotRatio: largest === 0 ? (n === 0 ? 1 : 0) : smallest / largest,
    solveInPlace: (b) => solve(lu, n, pivotRow, b),
  };
}

// Eliminates below the pivot of column j inside the panel that ends at `end`; returns the pivot's modulus.
function eliminateColumn(
  lu: Float64Array,
  n: number,
  j: number,
  end: number,
  floor: number,
  pivotRow: Int32Array,
): number {
  const at = j * n;
  let row = j;
  for (let i = j + 1; i < n; i++) if (Math.abs(lu[at + i]) > Math.abs(lu[at + row])) row = i;
  pivotRow[j] = row;
  if (row !== j) {
    for (let p = 0; p < n * n; p += n) {
      const kept = lu[p + j];
      lu[p + j] = lu[p + row];
      lu[p + row] = kept;
    }
  }
  const met = Math.abs(lu[at + j]);
  if (met < floor) lu[at + j] = lu[at + j] < 0 ? -floor : floor;
  // Division, not a reciprocal: the pivot may be so small that 1/pivot overflows.
  const pivot = lu[at + j];
  for (let i = j + 1; i < n; i++) lu[at + i] /= pivot;
  for (let c = j + 1; c < end; c++) {
    const factor = lu[c * n + j];
    if (factor === 0) continue;
    for (let i = j + 1; i < n; i++) lu[c * n + i] -= factor * lu[at + i];
  }
  return met;
}

function updateRight(lu: Float64Array, n: number, begin: number, end: number): void {
  const width = end - begin;
  solveUnitLowerBlock(lu, n, begin, end, lu, begin + end * n, n, n - end);
  const right: Block = { values: lu, at: begin + end * n, stride: n };
  const below: Block = { values: lu, at: end + begin * n, stride: n };
  const rest: Block = { values: lu, at: end + end * n, stride: n };
  addProductInto(rest, -1, below, right, n - end, n - end, width);
}

// Forward substitution with the unit lower triangle in rows and columns begin … end − 1.
function solveUnitLowerBlock(
  lu: Float64Array,
  n: number,
  begin: number,
  end: number,
  b: Float64Array,
  bAt: number,
  bStride: number,
  cols: number,
): void {
  for (let c = 0; c < cols; c++) {
    const at = bAt + c * bStride - begin;
    for (let k = begin; k < end; k++) {
      const x = b[at + k];
      if (x === 0) continue;
      for (let i = k + 1; i < end; i++) b[at + i] -= x * lu[k * n + i];
    }
  }
}

function solveUpperBlock(lu: Float64Array, n: number, begin: number, end: number, b: DenseMatrix): void {
  const x = b.values;
  for (let c = 0; c < b.cols; c++) {
    const at = c * n;
    for (let k = end - 1; k >= begin; k--) {
      x[at + k] /= lu[k * n + k];
      const xk = x[at + k];
      for (let i = begin; i < k; i++) x[at + i] -= xk * lu[k * n + i];
    }
  }
}

function solve(lu: Float64Array, n: number, pivotRow: Int32Array, b: DenseMatrix): void {
  invariant(b.rows === n, `solve of order ${n} with ${b.rows} rows`);
  const x = b.values;
  for (let c = 0; c < b.cols; c++) {
    for (let j = 0; j < n; j++) {
      const row = pivotRow[j];
      const kept = x[c * n + j];
      x[c * n + j] = x[c * n + row];
      x[c * n + row] = kept;
    }
  }
  for (let begin = 0; begin < n; begin += panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    solveUnitLowerBlock(lu, n, begin, end, x, begin, n, b.cols);
    const below: Block = { values: lu, at: end + begin * n, stride: n };
    addProductInto(
      { values: x, at: end, stride: n },
      -1,
      below,
      { values: x, at: begin, stride: n },
      n - end,
      b.cols,
      end - begin,
    );
  }
  for (let begin = Math.floor((n - 1) / panelWidth) * panelWidth; begin >= 0; begin -= panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    solveUpperBlock(lu, n, begin, end, b);
    const above: Block = { values: lu, at: begin * n, stride: n };
    addProductInto(
      { values: x, at: 0, stride: n },
      -1,
      above,
      { values: x, at: begin, stride: n },
      begin,
      b.cols,
      end - begin,
    );
  }
}
