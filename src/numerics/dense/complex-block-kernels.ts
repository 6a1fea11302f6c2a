/** Products of complex blocks inside column-major arrays; see `block-kernels.ts` for the real ones. */

import type { ComplexBlock } from "./block-kernels.js";

const rowSlab = 96;
const depthSlab = 192;

/** C ← C + α A B with C m×n, A m×k, B k×n, α real; C may share arrays with A and B but not overlap them. */
export function addComplexProductInto(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  m: number,
  n: number,
  k: number,
): void {
  for (let top = 0; top < m; top += rowSlab) {
    const height = Math.min(rowSlab, m - top);
    for (let j = 0; j < n; j++) {
      let p = 0;
      for (; p + 2 < k; p += 3) addThreeColumns(c, alpha, a, b, top, height, j, p);
      for (; p < k; p++) addOneColumn(c, alpha, a, b, top, height, j, p);
    }
  }
}

function addThreeColumns(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  top: number,
  height: number,
  j: number,
  p: number,
): void {
  const { re: cRe, im: cIm } = c;
  const { re: aRe, im: aIm } = a;
  const cAt = c.at + top + j * c.stride;
  const a0 = a.at + top + p * a.stride;
  const a1 = a0 + a.stride;
  const a2 = a1 + a.stride;
  const bAt = b.at + p + j * b.stride;
  const b0Re = alpha * b.re[bAt];
  const b0Im = alpha * b.im[bAt];
  const b1Re = alpha * b.re[bAt + 1];
  const b1Im = alpha * b.im[bAt + 1];
  const b2Re = alpha * b.re[bAt + 2];
  const b2Im = alpha * b.im[bAt + 2];
  for (let i = 0; i < height; i++) {
    const x0 = aRe[a0 + i];
    const y0 = aIm[a0 + i];
    const x1 = aRe[a1 + i];
    const y1 = aIm[a1 + i];
    const x2 = aRe[a2 + i];
    const y2 = aIm[a2 + i];
    cRe[cAt + i] += x0 * b0Re - y0 * b0Im + (x1 * b1Re - y1 * b1Im) + (x2 * b2Re - y2 * b2Im);
    cIm[cAt + i] += x0 * b0Im + y0 * b0Re + (x1 * b1Im + y1 * b1Re) + (x2 * b2Im + y2 * b2Re);
  }
}

function addOneColumn(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  top: number,
  height: number,
  j: number,
  p: number,
): void {
  const { re: cRe, im: cIm } = c;
  const { re: aRe, im: aIm } = a;
  const cAt = c.at + top + j * c.stride;
  const aAt = a.at + top + p * a.stride;
  const bRe = alpha * b.re[b.at + p + j * b.stride];
  const bIm = alpha * b.im[b.at + p + j * b.stride];
  for (let i = 0; i < height; i++) {
    const x = aRe[aAt + i];
    const y = aIm[aAt + i];
    cRe[cAt + i] += x * bRe - y * bIm;
    cIm[cAt + i] += x * bIm + y * bRe;
  }
}

/** C ← C + α Aᴴ B with C m×n, A k×m, B k×n, α real. */
export function addAdjointProductInto(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  m: number,
  n: number,
  k: number,
): void {
  for (let top = 0; top < k; top += depthSlab) {
    const depth = Math.min(depthSlab, k - top);
    for (let i = 0; i < m; i++) {
      let j = 0;
      for (; j + 1 < n; j += 2) addTwoDots(c, alpha, a, b, i, j, top, depth);
      if (j < n) addOneDot(c, alpha, a, b, i, j, top, depth);
    }
  }
}

function addTwoDots(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  i: number,
  j: number,
  top: number,
  depth: number,
): void {
  const { re: aRe, im: aIm } = a;
  const { re: bRe, im: bIm } = b;
  const aAt = a.at + i * a.stride + top;
  const b0 = b.at + j * b.stride + top;
  const b1 = b0 + b.stride;
  let s0Re = 0;
  let s0Im = 0;
  let s1Re = 0;
  let s1Im = 0;
  for (let p = 0; p < depth; p++) {
    const x = aRe[aAt + p];
    const y = aIm[aAt + p];
    const u0 = bRe[b0 + p];
    const v0 = bIm[b0 + p];
    s0Re += x * u0 + y * v0;
    s0Im += x * v0 - y * u0;
    const u1 = bRe[b1 + p];
    const v1 = bIm[b1 + p];
    s1Re += x * u1 + y * v1;
    s1Im += x * v1 - y * u1;
  }
  const cAt = c.at + i + j * c.stride;
  c.re[cAt] += alpha * s0Re;
  c.im[cAt] += alpha * s0Im;
  c.re[cAt + c.stride] += alpha * s1Re;
  c.im[cAt + c.stride] += alpha * s1Im;
}

function addOneDot(
  c: ComplexBlock,
  alpha: number,
  a: ComplexBlock,
  b: ComplexBlock,
  i: number,
  j: number,
  top: number,
  depth: number,
): void {
  const aAt = a.at + i * a.stride + top;
  const bAt = b.at + j * b.stride + top;
  let sRe = 0;
  let sIm = 0;
  for (let p = 0; p < depth; p++) {
    const x = a.re[aAt + p];
    const y = a.im[aAt + p];
    sRe += x * b.re[bAt + p] + y * b.im[bAt + p];
    sIm += x * b.im[bAt + p] - y * b.re[bAt + p];
  }
  c.re[c.at + i + j * c.stride] += alpha * sRe;
  c.im[c.at + i + j * c.stride] += alpha * sIm;
}
