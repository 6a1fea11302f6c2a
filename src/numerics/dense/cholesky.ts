/** Cholesky factors of real symmetric matrices and solves with triangles. */

import { invariant } from "../../errors.js";
import { addColumn, addProductInto, addTransposedProductInto, type Block } from "./block-kernels.js";
import { type DenseMatrix, zeros } from "./matrix.js";

const blockSize = 32;

/**
 * Lower triangular L with A = L Lᵀ, or null when A is not positive definite
 * (a pivot is not above 0, or an entry used is not finite). Only the lower
 * triangle of A is read. A of order 0 gives L of order 0.
 */
export function cholesky(a: DenseMatrix): DenseMatrix | null {
  invariant(a.rows === a.cols, `Cholesky factor of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const l = zeros(n, n);
  const x = l.values;
  for (let j = 0; j < n; j++) {
    const at = j + j * n;
    for (let i = 0; i < n - j; i++) x[at + i] = a.values[at + i];
    // Column j of A − L Lᵀ from the columns before it; row j of L is its coefficients.
    addColumn(x, at, -1, x, j, n, x, j, n, n - j, j);
    const pivot = x[at];
    if (!(pivot > 0 && pivot < Number.POSITIVE_INFINITY)) return null;
    const root = Math.sqrt(pivot);
    x[at] = root;
    for (let i = 1; i < n - j; i++) x[at + i] /= root;
  }
  return l;
}

/** b ← L⁻¹ b for every column of b. */
export function solveLowerInPlace(l: DenseMatrix, b: DenseMatrix): void {
  const n = l.rows;
  invariant(b.rows === n, `solve of order ${n} with ${b.rows} rows`);
  const t = l.values;
  const x = b.values;
  for (let begin = 0; begin < n; begin += blockSize) {
    const end = Math.min(begin + blockSize, n);
    for (let at = 0; at < x.length; at += n) {
      for (let k = begin; k < end; k++) {
        x[at + k] /= t[k + k * n];
        const xk = x[at + k];
        for (let i = k + 1; i < end; i++) x[at + i] -= xk * t[i + k * n];
      }
    }
    const below: Block = { values: t, at: end + begin * n, stride: n };
    const solved: Block = { values: x, at: begin, stride: n };
    addProductInto({ values: x, at: end, stride: n }, -1, below, solved, n - end, b.cols, end - begin);
  }
}

/** b ← L⁻ᵀ b for every column of b. */
export function solveLowerTransposedInPlace(l: DenseMatrix, b: DenseMatrix): void {
  const n = l.rows;
  invariant(b.rows === n, `solve of order ${n} with ${b.rows} rows`);
  const t = l.values;
  const x = b.values;
  for (let begin = Math.floor((n - 1) / blockSize) * blockSize; begin >= 0; begin -= blockSize) {
    const end = Math.min(begin + blockSize, n);
    const below: Block = { values: t, at: end + begin * n, stride: n };
    const solved: Block = { values: x, at: end, stride: n };
    addTransposedProductInto(
      { values: x, at: begin, stride: n },
      -1,
      below,
      solved,
      end - begin,
      b.cols,
      n - end,
    );
    for (let at = 0; at < x.length; at += n) {
      for (let k = end - 1; k >= begin; k--) {
        let sum = x[at + k];
        for (let i = k + 1; i < end; i++) sum -= t[i + k * n] * x[at + i];
        x[at + k] = sum / t[k + k * n];
      }
    }
  }
}
