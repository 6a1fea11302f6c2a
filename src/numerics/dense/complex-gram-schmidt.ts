/** Orthogonalisation of a complex vector against an orthonormal basis, a slab of rows and four columns at a time. */

import type { ComplexMatrix, ComplexVector } from "./matrix.js";

// A slab of 40 basis vectors stays in the second-level cache.
const rowSlab = 256;

/**
 * w ← (I − V Vᴴ)² w by two passes of classical Gram–Schmidt, the second of which reads the basis while the
 * first still writes: three readings of V in all. Orthogonal to rounding unless w lies in V's span to 1/eps.
 *
 * @param w - Column k of V's array or any other vector of its length, outside the columns used.
 * @param k - V are the first k columns.
 * @param h - Receives Vᴴw, the coefficients of both passes together; at least k long.
 *
 * Source: Giraud, Langou & Rozložník, Comput. Math. Appl. 50 (2005), pp. 1069–1075.
 */
export function orthogonaliseInPlace(w: ComplexVector, v: ComplexMatrix, k: number, h: ComplexVector): void {
  const n = w.re.length;
  const second = { re: new Float64Array(k), im: new Float64Array(k) };
  h.re.fill(0, 0, k);
  h.im.fill(0, 0, k);
  for (let top = 0; top < n; top += rowSlab) addDots(h, v, w, k, top, Math.min(n, top + rowSlab));
  for (let top = 0; top < n; top += rowSlab) {
    const end = Math.min(n, top + rowSlab);
    subtractCombination(w, v, h, k, top, end);
    addDots(second, v, w, k, top, end);
  }
  for (let top = 0; top < n; top += rowSlab) {
    subtractCombination(w, v, second, k, top, Math.min(n, top + rowSlab));
  }
  for (let j = 0; j < k; j++) {
    h.re[j] += second.re[j];
    h.im[j] += second.im[j];
  }
}

/** c ← c + Vᴴ w over rows `top` … `end` − 1. */
function addDots(
  c: ComplexVector,
  v: ComplexMatrix,
  w: ComplexVector,
  k: number,
  top: number,
  end: number,
): void {
  let j = 0;
  for (; j + 3 < k; j += 4) addFourDots(c, v, w, j, top, end);
  for (; j < k; j++) addOneDot(c, v, w, j, top, end);
}

function addFourDots(
  c: ComplexVector,
  v: ComplexMatrix,
  w: ComplexVector,
  j: number,
  top: number,
  end: number,
): void {
  const { re: vRe, im: vIm, rows } = v;
  const { re: wRe, im: wIm } = w;
  let p0 = j * rows + top;
  let p1 = p0 + rows;
  let p2 = p1 + rows;
  let p3 = p2 + rows;
  let re0 = 0;
  let im0 = 0;
  let re1 = 0;
  let im1 = 0;
  let re2 = 0;
  let im2 = 0;
  let re3 = 0;
  let im3 = 0;
  for (let i = top; i < end; i++) {
    const x = wRe[i];
    const y = wIm[i];
    const a0 = vRe[p0];
    const b0 = vIm[p0++];
    re0 += a0 * x + b0 * y;
    im0 += a0 * y - b0 * x;
    const a1 = vRe[p1];
    const b1 = vIm[p1++];
    re1 += a1 * x + b1 * y;
    im1 += a1 * y - b1 * x;
    const a2 = vRe[p2];
    const b2 = vIm[p2++];
    re2 += a2 * x + b2 * y;
    im2 += a2 * y - b2 * x;
    const a3 = vRe[p3];
    const b3 = vIm[p3++];
    re3 += a3 * x + b3 * y;
    im3 += a3 * y - b3 * x;
  }
  c.re[j] += re0;
  c.im[j] += im0;
  c.re[j + 1] += re1;
  c.im[j + 1] += im1;
  c.re[j + 2] += re2;
  c.im[j + 2] += im2;
  c.re[j + 3] += re3;
  c.im[j + 3] += im3;
}

function addOneDot(
  c: ComplexVector,
  v: ComplexMatrix,
  w: ComplexVector,
  j: number,
  top: number,
  end: number,
): void {
  const { re: vRe, im: vIm, rows } = v;
  const { re: wRe, im: wIm } = w;
  let re = 0;
  let im = 0;
  for (let i = top, p = j * rows + top; i < end; i++, p++) {
    re += vRe[p] * wRe[i] + vIm[p] * wIm[i];
    im += vRe[p] * wIm[i] - vIm[p] * wRe[i];
  }
  c.re[j] += re;
  c.im[j] += im;
}

/** w ← w − V c over rows `top` … `end` − 1. */
function subtractCombination(
  w: ComplexVector,
  v: ComplexMatrix,
  c: ComplexVector,
  k: number,
  top: number,
  end: number,
): void {
  let j = 0;
  for (; j + 3 < k; j += 4) subtractFour(w, v, c, j, top, end);
  for (; j < k; j++) subtractOne(w, v, c, j, top, end);
}

function subtractFour(
  w: ComplexVector,
  v: ComplexMatrix,
  c: ComplexVector,
  j: number,
  top: number,
  end: number,
): void {
  const { re: vRe, im: vIm, rows } = v;
  const { re: wRe, im: wIm } = w;
  const re0 = c.re[j];
  const im0 = c.im[j];
  const re1 = c.re[j + 1];
  const im1 = c.im[j + 1];
  const re2 = c.re[j + 2];
  const im2 = c.im[j + 2];
  const re3 = c.re[j + 3];
  const im3 = c.im[j + 3];
  let p0 = j * rows + top;
  let p1 = p0 + rows;
  let p2 = p1 + rows;
  let p3 = p2 + rows;
  for (let i = top; i < end; i++) {
    const a0 = vRe[p0];
    const b0 = vIm[p0++];
    const a1 = vRe[p1];
    const b1 = vIm[p1++];
    const a2 = vRe[p2];
    const b2 = vIm[p2++];
    const a3 = vRe[p3];
    const b3 = vIm[p3++];
    wRe[i] -= a0 * re0 - b0 * im0 + (a1 * re1 - b1 * im1) + (a2 * re2 - b2 * im2 + (a3 * re3 - b3 * im3));
    wIm[i] -= a0 * im0 + b0 * re0 + (a1 * im1 + b1 * re1) + (a2 * im2 + b2 * re2 + (a3 * im3 + b3 * re3));
  }
}

function subtractOne(
  w: ComplexVector,
  v: ComplexMatrix,
  c: ComplexVector,
  j: number,
  top: number,
  end: number,
): void {
  const { re: vRe, im: vIm, rows } = v;
  const { re: wRe, im: wIm } = w;
  const cRe = c.re[j];
  const cIm = c.im[j];
  for (let i = top, p = j * rows + top; i < end; i++, p++) {
    wRe[i] -= vRe[p] * cRe - vIm[p] * cIm;
    wIm[i] -= vRe[p] * cIm + vIm[p] * cRe;
  }
}
