/**
 * Dense complex kernels on column-major blocks inside larger arrays: a block is given by its
 * two arrays, the index of its first entry and the distance between columns. This file is all
 * that a compiled kernel has to replace.
 *
 * Source: Goto & van de Geijn, ACM TOMS 34(3), 2008 (packing and register blocks).
 */

/** A block of a matrix in split storage. */
export interface ComplexBlock {
  re: Float64Array;
  im: Float64Array;
  /** Index of the first entry. */
  at: number;
  /** Distance from one column to the next. */
  stride: number;
}

/** Rows of A packed at a time: with 32 columns they fill the first-level cache. */
const ROW_BLOCK = 64;

let packedA = new Float64Array(0);
let packedB = new Float64Array(0);

/**
 * C ← C − op(A) B with op(A) = A, or Aᴴ when `adjoint`; op(A) m×k, B k×n, C m×n.
 * C must not overlap A or B.
 */
export function subtractProductInto(
  c: ComplexBlock,
  a: ComplexBlock,
  b: ComplexBlock,
  m: number,
  n: number,
  k: number,
  adjoint: boolean,
): void {
  if (m <= 0 || n <= 0 || k <= 0) return;
  packRight(b, n, k);
  if (packedA.length < 4 * ROW_BLOCK * k) packedA = new Float64Array(4 * ROW_BLOCK * k);
  for (let i0 = 0; i0 < m; i0 += ROW_BLOCK) {
    const rows = Math.min(ROW_BLOCK, m - i0);
    if (adjoint) packLeftAdjoint(a, i0, rows, k);
    else packLeft(a, i0, rows, k);
    subtractPacked(c, i0, rows, n, k);
  }
}

/** Pairs of columns of B, row by row: re, im of the one, re, im of the other; an odd last column gets zeros. */
function packRight(b: ComplexBlock, n: number, k: number): void {
  const { re, im, at, stride } = b;
  const size = 2 * k * (n + (n & 1));
  if (packedB.length < size) packedB = new Float64Array(size);
  const packed = packedB;
  let q = 0;
  for (let j = 0; j + 1 < n; j += 2) {
    const first = at + j * stride;
    const second = first + stride;
    for (let p = 0; p < k; p++, q += 4) {
      packed[q] = re[first + p];
      packed[q + 1] = im[first + p];
      packed[q + 2] = re[second + p];
      packed[q + 3] = im[second + p];
    }
  }
  if ((n & 1) === 1) {
    const first = at + (n - 1) * stride;
    for (let p = 0; p < k; p++, q += 4) {
      packed[q] = re[first + p];
      packed[q + 1] = im[first + p];
      packed[q + 2] = 0;
      packed[q + 3] = 0;
    }
  }
}

/** Pairs of rows of A, column by column: re, im of the one, re, im of the other. */
function packLeft(a: ComplexBlock, i0: number, rows: number, k: number): void {
  const { re, im, stride } = a;
  const packed = packedA;
  const even = rows & ~1;
  for (let p = 0; p < k; p++) {
    const column = a.at + i0 + p * stride;
    let q = 4 * p;
    for (let i = 0; i < even; i += 2, q += 4 * k) {
      packed[q] = re[column + i];
      packed[q + 1] = im[column + i];
      packed[q + 2] = re[column + i + 1];
      packed[q + 3] = im[column + i + 1];
    }
    if (even < rows) {
      packed[q] = re[column + even];
      packed[q + 1] = im[column + even];
      packed[q + 2] = 0;
      packed[q + 3] = 0;
    }
  }
}

/** The same for Aᴴ, whose rows are the conjugated columns of A. */
function packLeftAdjoint(a: ComplexBlock, i0: number, rows: number, k: number): void {
  const { re, im, stride } = a;
  const packed = packedA;
  let q = 0;
  for (let i = 0; i < rows; i += 2) {
    const first = a.at + (i0 + i) * stride;
    const paired = i + 1 < rows;
    const second = paired ? first + stride : first;
    for (let p = 0; p < k; p++, q += 4) {
      packed[q] = re[first + p];
      packed[q + 1] = -im[first + p];
      packed[q + 2] = paired ? re[second + p] : 0;
      packed[q + 3] = paired ? -im[second + p] : 0;
    }
  }
}

function subtractPacked(c: ComplexBlock, i0: number, rows: number, n: number, k: number): void {
  const { re, im, stride } = c;
  const pa = packedA;
  const pb = packedB;
  for (let j = 0; j < n; j += 2) {
    const bBegin = 2 * j * k;
    const paired = j + 1 < n;
    for (let i = 0; i < rows; i += 2) {
      let s00r = 0;
      let s00i = 0;
      let s10r = 0;
      let s10i = 0;
      let s01r = 0;
      let s01i = 0;
      let s11r = 0;
      let s11i = 0;
      let q = 2 * i * k;
      const end = q + 4 * k;
      for (let t = bBegin; q < end; q += 4, t += 4) {
        const a0r = pa[q];
        const a0i = pa[q + 1];
        const a1r = pa[q + 2];
        const a1i = pa[q + 3];
        const b0r = pb[t];
        const b0i = pb[t + 1];
        s00r += a0r * b0r - a0i * b0i;
        s00i += a0r * b0i + a0i * b0r;
        s10r += a1r * b0r - a1i * b0i;
        s10i += a1r * b0i + a1i * b0r;
        const b1r = pb[t + 2];
        const b1i = pb[t + 3];
        s01r += a0r * b1r - a0i * b1i;
        s01i += a0r * b1i + a0i * b1r;
        s11r += a1r * b1r - a1i * b1i;
        s11i += a1r * b1i + a1i * b1r;
      }
      const at = c.at + i0 + i + j * stride;
      re[at] -= s00r;
      im[at] -= s00i;
      if (i + 1 < rows) {
        re[at + 1] -= s10r;
        im[at + 1] -= s10i;
      }
      if (paired) {
        re[at + stride] -= s01r;
        im[at + stride] -= s01i;
        if (i + 1 < rows) {
          re[at + stride + 1] -= s11r;
          im[at + stride + 1] -= s11i;
        }
      }
    }
  }
}

/** y ← y − A x for few columns n of x and y, four columns of A at a time; A m×k. */
export function subtractThinProductInto(
  y: ComplexBlock,
  a: ComplexBlock,
  x: ComplexBlock,
  m: number,
  n: number,
  k: number,
): void {
  for (let c = 0; c < n; c++) subtractColumnProduct(y, y.at + c * y.stride, a, x, x.at + c * x.stride, m, k);
}

function subtractColumnProduct(
  y: ComplexBlock,
  yAt: number,
  a: ComplexBlock,
  x: ComplexBlock,
  xAt: number,
  m: number,
  k: number,
): void {
  const { re: yRe, im: yIm } = y;
  const { re: aRe, im: aIm, stride } = a;
  const { re: xRe, im: xIm } = x;
  let p = 0;
  for (; p + 1 < k; p += 2) {
    const x0r = xRe[xAt + p];
    const x0i = xIm[xAt + p];
    const x1r = xRe[xAt + p + 1];
    const x1i = xIm[xAt + p + 1];
    let a0 = a.at + p * stride;
    let a1 = a0 + stride;
    for (let i = yAt; i < yAt + m; i++, a0++, a1++) {
      const a0r = aRe[a0];
      const a0i = aIm[a0];
      const a1r = aRe[a1];
      const a1i = aIm[a1];
      yRe[i] -= a0r * x0r - a0i * x0i + (a1r * x1r - a1i * x1i);
      yIm[i] -= a0r * x0i + a0i * x0r + (a1r * x1i + a1i * x1r);
    }
  }
  if (p < k) {
    const x0r = xRe[xAt + p];
    const x0i = xIm[xAt + p];
    let a0 = a.at + p * stride;
    for (let i = yAt; i < yAt + m; i++, a0++) {
      yRe[i] -= aRe[a0] * x0r - aIm[a0] * x0i;
      yIm[i] -= aRe[a0] * x0i + aIm[a0] * x0r;
    }
  }
}

/** y ← y − Aᴴ x for few columns n of x and y; A k×m. */
export function subtractThinAdjointProductInto(
  y: ComplexBlock,
  a: ComplexBlock,
  x: ComplexBlock,
  m: number,
  n: number,
  k: number,
): void {
  const { re: aRe, im: aIm, stride } = a;
  for (let c = 0; c < n; c++) {
    const yAt = y.at + c * y.stride;
    const xAt = x.at + c * x.stride;
    for (let i = 0; i < m; i++) {
      const column = a.at + i * stride;
      let sumRe = 0;
      let sumIm = 0;
      for (let p = 0; p < k; p++) {
        const ar = aRe[column + p];
        const ai = aIm[column + p];
        const xr = x.re[xAt + p];
        const xi = x.im[xAt + p];
        sumRe += ar * xr + ai * xi;
        sumIm += ar * xi - ai * xr;
      }
      y.re[yAt + i] -= sumRe;
      y.im[yAt + i] -= sumIm;
    }
  }
}

/** X ← L⁻¹ X with L k×k unit lower triangular, X k×n. */
export function solveUnitLowerInPlace(l: ComplexBlock, x: ComplexBlock, n: number, k: number): void {
  const { re: lRe, im: lIm, stride } = l;
  const { re, im } = x;
  for (let c = 0; c < n; c++) {
    const xAt = x.at + c * x.stride;
    for (let p = 0; p < k - 1; p++) {
      const xr = re[xAt + p];
      const xi = im[xAt + p];
      const column = l.at + p * stride;
      for (let i = p + 1; i < k; i++) {
        re[xAt + i] -= lRe[column + i] * xr - lIm[column + i] * xi;
        im[xAt + i] -= lRe[column + i] * xi + lIm[column + i] * xr;
      }
    }
  }
}

/** X ← L⁻ᴴ X with L k×k unit lower triangular, X k×n. */
export function solveUnitLowerAdjointInPlace(l: ComplexBlock, x: ComplexBlock, n: number, k: number): void {
  const { re: lRe, im: lIm, stride } = l;
  const { re, im } = x;
  for (let c = 0; c < n; c++) {
    const xAt = x.at + c * x.stride;
    for (let p = k - 2; p >= 0; p--) {
      const column = l.at + p * stride;
      let sumRe = re[xAt + p];
      let sumIm = im[xAt + p];
      for (let i = p + 1; i < k; i++) {
        const xr = re[xAt + i];
        const xi = im[xAt + i];
        sumRe -= lRe[column + i] * xr + lIm[column + i] * xi;
        sumIm -= lRe[column + i] * xi - lIm[column + i] * xr;
      }
      re[xAt + p] = sumRe;
      im[xAt + p] = sumIm;
    }
  }
}

/** X ← U⁻¹ X with U k×k upper triangular, X k×n. */
export function solveUpperInPlace(u: ComplexBlock, x: ComplexBlock, n: number, k: number): void {
  const { re: uRe, im: uIm, stride } = u;
  const { re, im } = x;
  for (let p = k - 1; p >= 0; p--) {
    const column = u.at + p * stride;
    const dr = uRe[column + p];
    const di = uIm[column + p];
    const d = 1 / (dr * dr + di * di);
    for (let c = 0; c < n; c++) {
      const xAt = x.at + c * x.stride;
      const xr = (re[xAt + p] * dr + im[xAt + p] * di) * d;
      const xi = (im[xAt + p] * dr - re[xAt + p] * di) * d;
      re[xAt + p] = xr;
      im[xAt + p] = xi;
      for (let i = 0; i < p; i++) {
        re[xAt + i] -= uRe[column + i] * xr - uIm[column + i] * xi;
        im[xAt + i] -= uRe[column + i] * xi + uIm[column + i] * xr;
      }
    }
  }
}

/** X ← U⁻ᴴ X with U k×k upper triangular, X k×n. */
export function solveUpperAdjointInPlace(u: ComplexBlock, x: ComplexBlock, n: number, k: number): void {
  const { re: uRe, im: uIm, stride } = u;
  const { re, im } = x;
  for (let p = 0; p < k; p++) {
    const column = u.at + p * stride;
    const dr = uRe[column + p];
    const di = uIm[column + p];
    const d = 1 / (dr * dr + di * di);
    for (let c = 0; c < n; c++) {
      const xAt = x.at + c * x.stride;
      let sumRe = re[xAt + p];
      let sumIm = im[xAt + p];
      for (let i = 0; i < p; i++) {
        const ur = uRe[column + i];
        const ui = uIm[column + i];
        sumRe -= ur * re[xAt + i] + ui * im[xAt + i];
        sumIm -= ur * im[xAt + i] - ui * re[xAt + i];
      }
      // Division by the conjugate of the pivot.
      re[xAt + p] = (sumRe * dr - sumIm * di) * d;
      im[xAt + p] = (sumIm * dr + sumRe * di) * d;
    }
  }
}
