/** Eigenvalues of general complex matrices. */

import { invariant, NumericalError } from "../../errors.js";
import { balance } from "./balance.js";
import type { Eigenvalues } from "./eigen.js";
import { powerOfTwoAbove, requireFiniteMaximum } from "./finite.js";
import type { ComplexMatrix } from "./matrix.js";

const sweepsPerValue = 60;

/**
 * All eigenvalues of a complex n×n matrix, in no order: balancing, Hessenberg
 * form by Householder reflectors, single-shift implicit QR by rotations.
 * Meant for orders to some hundred.
 *
 * @throws NumericalError `numerics.not-finite`, `numerics.no-convergence`.
 *
 * Source: Golub & Van Loan, Matrix Computations, 4th ed., 2013, chapter 7.
 */
export function complexEigenvalues(a: ComplexMatrix): Eigenvalues {
  invariant(a.rows === a.cols, `eigenvalues of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const what = "A complex matrix whose eigenvalues are wanted";
  const scale = powerOfTwoAbove(Math.max(requireFiniteMaximum(a.re, what), requireFiniteMaximum(a.im, what)));
  const re = a.re.map((x) => x / scale);
  const im = a.im.map((x) => x / scale);
  balance(re, im, n);
  for (let k = 0; k < n - 2; k++) clearColumn(re, im, n, k);

  const values: Eigenvalues = { re: new Float64Array(n), im: new Float64Array(n) };
  const shift = new Float64Array(2);
  let last = n - 1;
  let sweeps = 0;
  while (last >= 0) {
    const first = activeStart(re, im, n, last);
    if (first === last) {
      values.re[last] = re[last + last * n] * scale;
      values.im[last] = im[last + last * n] * scale;
      last--;
      sweeps = 0;
      continue;
    }
    if (++sweeps > sweepsPerValue) {
      throw new NumericalError(
        "numerics.no-convergence",
        `The complex QR iteration did not settle on eigenvalue ${last + 1} of ${n}.`,
        "Check the matrices for entries of absurd size.",
      );
    }
    chooseShift(re, im, n, last, sweeps, shift);
    sweep(re, im, n, first, last, shift);
  }
  return values;
}

/** A ← H A H with the reflector H = I − τ v vᴴ, τ real, that clears column k below its subdiagonal. */
function clearColumn(re: Float64Array, im: Float64Array, n: number, k: number): void {
  const vRe = re.slice(k * n, (k + 1) * n);
  const vIm = im.slice(k * n, (k + 1) * n);
  const top = k + 1;
  let tail = 0;
  for (let i = top + 1; i < n; i++) tail += vRe[i] * vRe[i] + vIm[i] * vIm[i];
  if (tail === 0) return;
  const head = Math.hypot(vRe[top], vIm[top]);
  const norm = Math.sqrt(head * head + tail);
  // The entry that remains is −norm times the phase of the head, so nothing cancels.
  const cosine = head === 0 ? 1 : vRe[top] / head;
  const sine = head === 0 ? 0 : vIm[top] / head;
  vRe[top] += norm * cosine;
  vIm[top] += norm * sine;
  const tau = 1 / (norm * (norm + head));
  for (let j = k; j < n; j++) reflectColumn(re, im, j * n, vRe, vIm, tau, top, n);
  reflectRows(re, im, n, vRe, vIm, tau, top);
  for (let i = top + 1; i < n; i++) re[i + k * n] = im[i + k * n] = 0;
}

// x ← x − τ v (vᴴ x).
function reflectColumn(
  re: Float64Array,
  im: Float64Array,
  at: number,
  vRe: Float64Array,
  vIm: Float64Array,
  tau: number,
  top: number,
  n: number,
): void {
  let sRe = 0;
  let sIm = 0;
  for (let i = top; i < n; i++) {
    sRe += vRe[i] * re[at + i] + vIm[i] * im[at + i];
    sIm += vRe[i] * im[at + i] - vIm[i] * re[at + i];
  }
  sRe *= tau;
  sIm *= tau;
  for (let i = top; i < n; i++) {
    re[at + i] -= sRe * vRe[i] - sIm * vIm[i];
    im[at + i] -= sRe * vIm[i] + sIm * vRe[i];
  }
}

// A ← A − τ (A v) vᴴ.
function reflectRows(
  re: Float64Array,
  im: Float64Array,
  n: number,
  vRe: Float64Array,
  vIm: Float64Array,
  tau: number,
  top: number,
): void {
  const yRe = new Float64Array(n);
  const yIm = new Float64Array(n);
  for (let j = top; j < n; j++) {
    const at = j * n;
    for (let i = 0; i < n; i++) {
      yRe[i] += re[at + i] * vRe[j] - im[at + i] * vIm[j];
      yIm[i] += re[at + i] * vIm[j] + im[at + i] * vRe[j];
    }
  }
  for (let j = top; j < n; j++) {
    const at = j * n;
    const cRe = tau * vRe[j];
    const cIm = -tau * vIm[j];
    for (let i = 0; i < n; i++) {
      re[at + i] -= yRe[i] * cRe - yIm[i] * cIm;
      im[at + i] -= yRe[i] * cIm + yIm[i] * cRe;
    }
  }
}

function modulus(re: Float64Array, im: Float64Array, at: number): number {
  return Math.abs(re[at]) + Math.abs(im[at]);
}

/** The first row of the unreduced block that ends at `last`; a negligible subdiagonal entry is cleared. */
function activeStart(re: Float64Array, im: Float64Array, n: number, last: number): number {
  for (let k = last; k > 0; k--) {
    const at = k + k * n;
    const sub = modulus(re, im, at - n);
    const size = modulus(re, im, at) + modulus(re, im, at - n - 1);
    if (sub <= Number.EPSILON * size || sub <= Number.MIN_VALUE * 2 ** 100) {
      re[at - n] = im[at - n] = 0;
      return k;
    }
  }
  return 0;
}

/** The eigenvalue of the trailing 2×2 block nearer to its last entry; an exceptional one every tenth sweep. */
function chooseShift(
  re: Float64Array,
  im: Float64Array,
  n: number,
  last: number,
  sweeps: number,
  shift: Float64Array,
): void {
  const d = last + last * n;
  const [a, b, c] = [d - n - 1, d - 1, d - n];
  if (sweeps % 10 === 0) {
    shift[0] = re[d] + 0.75 * modulus(re, im, c);
    shift[1] = im[d];
    return;
  }
  // With h = (a − d)/2 the eigenvalues are d + h ± √(h² + b c); the nearer one is d − b c / (h ± √…).
  const hRe = (re[a] - re[d]) / 2;
  const hIm = (im[a] - im[d]) / 2;
  const bcRe = re[b] * re[c] - im[b] * im[c];
  const bcIm = re[b] * im[c] + im[b] * re[c];
  const qRe = hRe * hRe - hIm * hIm + bcRe;
  const qIm = 2 * hRe * hIm + bcIm;
  const size = Math.sqrt(Math.hypot(qRe, qIm));
  const angle = Math.atan2(qIm, qRe) / 2;
  let rootRe = size * Math.cos(angle);
  let rootIm = size * Math.sin(angle);
  if (rootRe * hRe + rootIm * hIm < 0) {
    rootRe = -rootRe;
    rootIm = -rootIm;
  }
  const sumRe = hRe + rootRe;
  const sumIm = hIm + rootIm;
  const square = sumRe * sumRe + sumIm * sumIm;
  shift[0] = re[d];
  shift[1] = im[d];
  if (square === 0) return;
  shift[0] -= (bcRe * sumRe + bcIm * sumIm) / square;
  shift[1] -= (bcIm * sumRe - bcRe * sumIm) / square;
}

function sweep(
  re: Float64Array,
  im: Float64Array,
  n: number,
  first: number,
  last: number,
  shift: Float64Array,
): void {
  const start = first + first * n;
  let xRe = re[start] - shift[0];
  let xIm = im[start] - shift[1];
  let yRe = re[start + 1];
  let yIm = im[start + 1];
  for (let k = first; k < last; k++) {
    if (k > first) {
      const at = k + (k - 1) * n;
      xRe = re[at];
      xIm = im[at];
      yRe = re[at + 1];
      yIm = im[at + 1];
    }
    // [x; y] ← G [x; y] = [r; 0], G = [c, s; −s̄, c] with c real.
    const xSize = Math.hypot(xRe, xIm);
    const norm = Math.hypot(xSize, Math.hypot(yRe, yIm));
    if (norm === 0) continue;
    const phaseRe = xSize === 0 ? 1 : xRe / xSize;
    const phaseIm = xSize === 0 ? 0 : xIm / xSize;
    const c = xSize / norm;
    const sRe = (phaseRe * yRe + phaseIm * yIm) / norm;
    const sIm = (phaseIm * yRe - phaseRe * yIm) / norm;
    rotateRows(re, im, n, k, Math.max(first, k - 1), last, c, sRe, sIm);
    rotateColumns(re, im, n, k, first, Math.min(k + 2, last), c, sRe, sIm);
    if (k > first) re[k + 1 + (k - 1) * n] = im[k + 1 + (k - 1) * n] = 0;
  }
}

function rotateRows(
  re: Float64Array,
  im: Float64Array,
  n: number,
  k: number,
  begin: number,
  last: number,
  c: number,
  sRe: number,
  sIm: number,
): void {
  for (let at = k + begin * n; at <= k + last * n; at += n) {
    const aRe = re[at];
    const aIm = im[at];
    const bRe = re[at + 1];
    const bIm = im[at + 1];
    re[at] = c * aRe + sRe * bRe - sIm * bIm;
    im[at] = c * aIm + sRe * bIm + sIm * bRe;
    re[at + 1] = c * bRe - sRe * aRe - sIm * aIm;
    im[at + 1] = c * bIm - sRe * aIm + sIm * aRe;
  }
}

// Columns k and k + 1 times Gᴴ.
function rotateColumns(
  re: Float64Array,
  im: Float64Array,
  n: number,
  k: number,
  begin: number,
  last: number,
  c: number,
  sRe: number,
  sIm: number,
): void {
  const p = k * n;
  const q = p + n;
  for (let i = begin; i <= last; i++) {
    const aRe = re[p + i];
    const aIm = im[p + i];
    const bRe = re[q + i];
    const bIm = im[q + i];
    re[p + i] = c * aRe + sRe * bRe + sIm * bIm;
    im[p + i] = c * aIm + sRe * bIm - sIm * bRe;
    re[q + i] = c * bRe - sRe * aRe + sIm * aIm;
    im[q + i] = c * bIm - sRe * aIm - sIm * aRe;
  }
}
