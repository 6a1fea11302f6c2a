/**
 * Y ← Y − A X and Y − Aᴴ X for a sparse complex A and few columns at a time: columns that share
 * a pass share the reading of the matrix, which costs more than the arithmetic.
 */

import type { ComplexMatrix } from "../dense/matrix.js";
import type { ComplexValues, SparsePattern } from "./sparse-matrix.js";

/** Most columns that one pass takes. */
export const SHARED_COLUMNS = 4;

/** Columns of Y less A times the same columns of X; one to `SHARED_COLUMNS` of them. */
export function subtractProductInto(
  y: ComplexMatrix,
  pattern: SparsePattern,
  values: ComplexValues,
  x: ComplexMatrix,
  columns: readonly number[],
): void {
  const n = pattern.rows;
  if (columns.length === SHARED_COLUMNS) {
    const [a, b, c, d] = columns;
    subtractFour(y, pattern, values, x, [a * n, b * n, c * n, d * n]);
  } else {
    for (const c of columns) subtractOne(y, pattern, values, x, c * n);
  }
}

function subtractOne(
  y: ComplexMatrix,
  { cols, colStart, rowIndex }: SparsePattern,
  { re: aRe, im: aIm }: ComplexValues,
  x: ComplexMatrix,
  shift: number,
): void {
  const { re: yRe, im: yIm } = y;
  for (let j = 0; j < cols; j++) {
    const xr = x.re[shift + j];
    const xi = x.im[shift + j];
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = shift + rowIndex[p];
      yRe[i] -= aRe[p] * xr - aIm[p] * xi;
      yIm[i] -= aRe[p] * xi + aIm[p] * xr;
    }
  }
}

type FourShifts = readonly [number, number, number, number];

function subtractFour(
  y: ComplexMatrix,
  { cols, colStart, rowIndex }: SparsePattern,
  { re: aRe, im: aIm }: ComplexValues,
  x: ComplexMatrix,
  [s0, s1, s2, s3]: FourShifts,
): void {
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    const x0r = xRe[s0 + j];
    const x0i = xIm[s0 + j];
    const x1r = xRe[s1 + j];
    const x1i = xIm[s1 + j];
    const x2r = xRe[s2 + j];
    const x2i = xIm[s2 + j];
    const x3r = xRe[s3 + j];
    const x3i = xIm[s3 + j];
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = rowIndex[p];
      const ar = aRe[p];
      const ai = aIm[p];
      yRe[s0 + i] -= ar * x0r - ai * x0i;
      yIm[s0 + i] -= ar * x0i + ai * x0r;
      yRe[s1 + i] -= ar * x1r - ai * x1i;
      yIm[s1 + i] -= ar * x1i + ai * x1r;
      yRe[s2 + i] -= ar * x2r - ai * x2i;
      yIm[s2 + i] -= ar * x2i + ai * x2r;
      yRe[s3 + i] -= ar * x3r - ai * x3i;
      yIm[s3 + i] -= ar * x3i + ai * x3r;
    }
  }
}

/** The same with Aᴴ. */
export function subtractAdjointProductInto(
  y: ComplexMatrix,
  pattern: SparsePattern,
  values: ComplexValues,
  x: ComplexMatrix,
  columns: readonly number[],
): void {
  const n = pattern.rows;
  for (let t = 0; t < columns.length; t += 2) {
    const first = columns[t] * n;
    if (t + 1 < columns.length) subtractAdjointTwo(y, pattern, values, x, first, columns[t + 1] * n);
    else subtractAdjointOne(y, pattern, values, x, first);
  }
}

function subtractAdjointOne(
  y: ComplexMatrix,
  { cols, colStart, rowIndex }: SparsePattern,
  { re: aRe, im: aIm }: ComplexValues,
  x: ComplexMatrix,
  shift: number,
): void {
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    let sumRe = 0;
    let sumIm = 0;
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = shift + rowIndex[p];
      sumRe += aRe[p] * xRe[i] + aIm[p] * xIm[i];
      sumIm += aRe[p] * xIm[i] - aIm[p] * xRe[i];
    }
    y.re[shift + j] -= sumRe;
    y.im[shift + j] -= sumIm;
  }
}

function subtractAdjointTwo(
  y: ComplexMatrix,
  { cols, colStart, rowIndex }: SparsePattern,
  { re: aRe, im: aIm }: ComplexValues,
  x: ComplexMatrix,
  s0: number,
  s1: number,
): void {
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    let sum0r = 0;
    let sum0i = 0;
    let sum1r = 0;
    let sum1i = 0;
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = rowIndex[p];
      const ar = aRe[p];
      const ai = aIm[p];
      sum0r += ar * xRe[s0 + i] + ai * xIm[s0 + i];
      sum0i += ar * xIm[s0 + i] - ai * xRe[s0 + i];
      sum1r += ar * xRe[s1 + i] + ai * xIm[s1 + i];
      sum1i += ar * xIm[s1 + i] - ai * xRe[s1 + i];
    }
    y.re[s0 + j] -= sum0r;
    y.im[s0 + j] -= sum0i;
    y.re[s1 + j] -= sum1r;
    y.im[s1 + j] -= sum1i;
  }
}
