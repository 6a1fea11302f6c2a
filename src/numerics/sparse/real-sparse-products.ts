/** Products of a sparse real A with complex vectors: both parts share the reading of the matrix. */

import type { ComplexVector } from "../dense/matrix.js";
import type { SparseMatrix } from "./sparse-matrix.js";

/** y ← y + c A x with c = cRe + i cIm; y and x must not alias. */
export function addRealProductInto(
  y: ComplexVector,
  cRe: number,
  cIm: number,
  a: SparseMatrix,
  x: ComplexVector,
): void {
  const { cols, colStart, rowIndex, values } = a;
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    const re = cRe * xRe[j] - cIm * xIm[j];
    const im = cRe * xIm[j] + cIm * xRe[j];
    if (re === 0 && im === 0) continue;
    const end = colStart[j + 1];
    for (let p = colStart[j]; p < end; p++) {
      const i = rowIndex[p];
      const value = values[p];
      yRe[i] += value * re;
      yIm[i] += value * im;
    }
  }
}

/** y ← y + c Aᵀ x with c = cRe + i cIm; y and x must not alias. */
export function addRealTransposedProductInto(
  y: ComplexVector,
  cRe: number,
  cIm: number,
  a: SparseMatrix,
  x: ComplexVector,
): void {
  const { cols, colStart, rowIndex, values } = a;
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    let re = 0;
    let im = 0;
    const end = colStart[j + 1];
    for (let p = colStart[j]; p < end; p++) {
      const i = rowIndex[p];
      const value = values[p];
      re += value * xRe[i];
      im += value * xIm[i];
    }
    yRe[j] += cRe * re - cIm * im;
    yIm[j] += cRe * im + cIm * re;
  }
}
