/**
 * Products of a sparse real A with complex vectors, whose two parts share the reading of the matrix, and with
 * several real ones.
 */

import { type ComplexVector, column, type DenseMatrix, zeros } from "../dense/matrix.js";
import { multiplyAddInto, type SparseMatrix } from "./sparse-matrix.js";

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

/** Y = A X for real X of any width, a new matrix; four columns share a pass. */
export function multiplyColumns(a: SparseMatrix, x: DenseMatrix): DenseMatrix {
  const y = zeros(a.rows, x.cols);
  let j = 0;
  for (; j + 3 < x.cols; j += 4) addFourColumns(y, a, x, j);
  for (; j < x.cols; j++) multiplyAddInto(column(y, j), 1, a, column(x, j));
  return y;
}

function addFourColumns(y: DenseMatrix, a: SparseMatrix, x: DenseMatrix, first: number): void {
  const { rows, cols, colStart, rowIndex, values } = a;
  const from = x.values;
  const to = y.values;
  const x0 = first * cols;
  const x1 = x0 + cols;
  const x2 = x1 + cols;
  const x3 = x2 + cols;
  const y0 = first * rows;
  const y1 = y0 + rows;
  const y2 = y1 + rows;
  const y3 = y2 + rows;
  for (let j = 0; j < cols; j++) {
    const a0 = from[x0 + j];
    const a1 = from[x1 + j];
    const a2 = from[x2 + j];
    const a3 = from[x3 + j];
    const end = colStart[j + 1];
    for (let p = colStart[j]; p < end; p++) {
      const i = rowIndex[p];
      const value = values[p];
      to[y0 + i] += value * a0;
      to[y1 + i] += value * a1;
      to[y2 + i] += value * a2;
      to[y3 + i] += value * a3;
    }
  }
}

/**
 * y ← y + (a M + b C + c S) x for three matrices on one pattern, a = aRe + i aIm and so on; y and x must not alias.
 * One pass over the pattern in place of three.
 */
export function addPencilProductInto(
  y: ComplexVector,
  [aRe, aIm, bRe, bIm, c]: readonly [number, number, number, number, number],
  mass: SparseMatrix,
  velocity: SparseMatrix,
  displacement: SparseMatrix,
  x: ComplexVector,
): void {
  const { cols, colStart, rowIndex, values: m } = mass;
  const v = velocity.values;
  const s = displacement.values;
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    const re = xRe[j];
    const im = xIm[j];
    const end = colStart[j + 1];
    for (let p = colStart[j]; p < end; p++) {
      const i = rowIndex[p];
      const pRe = aRe * m[p] + bRe * v[p] + c * s[p];
      const pIm = aIm * m[p] + bIm * v[p];
      yRe[i] += pRe * re - pIm * im;
      yIm[i] += pRe * im + pIm * re;
    }
  }
}

/** Y ← Y − Aᵀ X for four columns in one pass over the matrix. */
export function subtractFourTransposed(
  { cols, colStart, rowIndex, values }: SparseMatrix,
  [x0, x1, x2, x3]: readonly Float64Array[],
  [y0, y1, y2, y3]: readonly Float64Array[],
): void {
  for (let j = 0; j < cols; j++) {
    let s0 = 0;
    let s1 = 0;
    let s2 = 0;
    let s3 = 0;
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = rowIndex[p];
      const a = values[p];
      s0 += a * x0[i];
      s1 += a * x1[i];
      s2 += a * x2[i];
      s3 += a * x3[i];
    }
    y0[j] -= s0;
    y1[j] -= s1;
    y2[j] -= s2;
    y3[j] -= s3;
  }
}
