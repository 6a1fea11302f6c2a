import { NumericalError } from "../../errors.js";
import { type Reflectors, reflectColumns, reflectVectors } from "./bulge-kernels.js";
import { type StandardPair, standardisePair } from "./standard-pair.js";

const sweepsPerValue = 60;
const sweepsBeforeException = 10;
const window = 32;
const tiny = Number.MIN_VALUE * 2 ** 100;

/** The matrix under iteration and everything the sweeps share. */
interface Iteration {
  readonly h: Float64Array;
  readonly n: number;
  /** Rows of length n to be multiplied by Z, or null: then only the active block of H is kept up. */
  readonly z: Float64Array | null;
  readonly reflectors: Reflectors;
  /** First column of the double-shift polynomial, [x, y, z]. */
  readonly start: Float64Array;
  /** Two shifts: re1, im1, re2, im2. */
  readonly shifts: Float64Array;
  readonly pair: StandardPair;
}

/**
 * Francis' implicit double-shift QR iteration on an upper Hessenberg matrix.
 * The deflation test is the conservative one of Ahues and Tisseur. Reflectors are
 * gathered over a window of columns and applied to the rest afterwards, column by
 * column and row by row of Z, where each entry is touched once per window.
 *
 * @param h - H, n×n by columns, zero below the subdiagonal, of norm about 1.
 *   With `z` it becomes the quasi-triangular T with standardised 2×2 blocks; without, it is destroyed.
 * @param z - Rows of length n one after the other (those of Q, or any); becomes z Z. Null for eigenvalues only.
 * @param re - Filled with the real parts, length n.
 * @param im - Filled with the imaginary parts, conjugate pairs adjacent, positive first.
 * @throws NumericalError `numerics.no-convergence` after 60 sweeps without a deflation.
 *
 * Source: Golub & Van Loan, Matrix Computations, 4th ed., 2013, section 7.5;
 * Ahues & Tisseur, LAPACK Working Note 122, 1997.
 */
export function realSchur(
  h: Float64Array,
  n: number,
  z: Float64Array | null,
  re: Float64Array,
  im: Float64Array,
): void {
  const iteration: Iteration = {
    h,
    n,
    z,
    reflectors: { tau: new Float64Array(n), v: new Float64Array(n), w: new Float64Array(n) },
    start: new Float64Array(3),
    shifts: new Float64Array(4),
    pair: { a: 0, b: 0, c: 0, d: 0, cosine: 1, sine: 0 },
  };
  let last = n - 1;
  let sweeps = 0;
  while (last >= 0) {
    const first = activeStart(h, n, last);
    if (first > 0) h[first + (first - 1) * n] = 0;
    if (first >= last - 1) {
      if (first === last) {
        re[last] = h[last + last * n];
        im[last] = 0;
      } else {
        deflatePair(iteration, first, re, im);
      }
      last = first - 1;
      sweeps = 0;
      continue;
    }
    if (++sweeps > sweepsPerValue) {
      throw new NumericalError(
        "numerics.no-convergence",
        `The QR iteration did not settle on eigenvalue ${last + 1} of ${n}.`,
        "Check the matrices for entries of absurd size.",
      );
    }
    chooseShifts(iteration, first, last, sweeps);
    sweep(iteration, first, startRow(iteration, first, last), last);
  }
}

/** The first row of the unreduced block that ends at `last`. */
function activeStart(h: Float64Array, n: number, last: number): number {
  let k = last;
  for (; k > 0; k--) {
    const at = k + k * n;
    const sub = Math.abs(h[at - n]);
    if (sub <= tiny) break;
    const here = Math.abs(h[at]);
    let size = here + Math.abs(h[at - n - 1]);
    if (size === 0) {
      if (k > 1) size += Math.abs(h[at - 2 * n - 1]);
      if (k < n - 1) size += Math.abs(h[at + 1]);
    }
    if (sub > Number.EPSILON * size) continue;
    const above = Math.abs(h[at - 1]);
    const gap = Math.abs(h[at - n - 1] - h[at]);
    const big = Math.max(here, gap);
    const sum = big + Math.max(sub, above);
    const product = Math.min(sub, above) * (Math.max(sub, above) / sum);
    if (product <= Math.max(tiny, Number.EPSILON * Math.min(here, gap) * (big / sum))) break;
  }
  return k;
}

function chooseShifts(it: Iteration, first: number, last: number, sweeps: number): void {
  const { h, n } = it;
  let a = h[last - 1 + (last - 1) * n];
  let b = h[last - 1 + last * n];
  let c = h[last + (last - 1) * n];
  let d = h[last + last * n];
  // Every tenth sweep an exceptional shift breaks cycles, from alternating ends.
  if (sweeps % sweepsBeforeException === 0) {
    const atTop = sweeps % (2 * sweepsBeforeException) !== 0;
    const corner = atTop ? first : last;
    const size = atTop
      ? Math.abs(h[first + 1 + first * n]) + Math.abs(h[first + 2 + (first + 1) * n])
      : Math.abs(c) + Math.abs(h[last - 1 + (last - 2) * n]);
    a = d = 0.75 * size + h[corner + corner * n];
    b = -0.4375 * size;
    c = size;
  }
  shiftsOfBlock(a, b, c, d, it.shifts);
}

// Eigenvalues of [[a, b], [c, d]]; of two real ones the one nearer to d, twice.
function shiftsOfBlock(a: number, b: number, c: number, d: number, shifts: Float64Array): void {
  const size = Math.abs(a) + Math.abs(b) + Math.abs(c) + Math.abs(d);
  shifts.fill(0);
  if (size === 0) return;
  const mean = (a / size + d / size) / 2;
  const det = (a / size - mean) * (d / size - mean) - (b / size) * (c / size);
  const root = Math.sqrt(Math.abs(det));
  if (det >= 0) {
    shifts[0] = shifts[2] = mean * size;
    shifts[1] = root * size;
    shifts[3] = -root * size;
  } else {
    const upper = mean + root;
    const lower = mean - root;
    const nearer = Math.abs(upper - d / size) <= Math.abs(lower - d / size) ? upper : lower;
    shifts[0] = shifts[2] = nearer * size;
  }
}

/** Where the bulge may start because two neighbouring subdiagonals are small; fills `start`. */
function startRow(it: Iteration, first: number, last: number): number {
  const { h, n, start, shifts } = it;
  const [re1, im1, re2, im2] = shifts;
  for (let m = last - 2; ; m--) {
    const at = m + m * n;
    const sub = h[at + 1];
    const size = Math.abs(h[at] - re2) + Math.abs(im2) + Math.abs(sub);
    const scaled = sub / size;
    const x = scaled * h[at + n] + (h[at] - re1) * ((h[at] - re2) / size) - im1 * (im2 / size);
    const y = scaled * (h[at] + h[at + n + 1] - re1 - re2);
    const w = scaled * h[at + n + 2];
    const sum = Math.abs(x) + Math.abs(y) + Math.abs(w);
    start[0] = x / sum;
    start[1] = y / sum;
    start[2] = w / sum;
    if (m === first) return m;
    const before = Math.abs(h[at - n - 1]);
    const diagonal = Math.abs(h[at]) + before + Math.abs(h[at + n + 1]);
    const left = Math.abs(h[at - n]) * (Math.abs(start[1]) + Math.abs(start[2]));
    if (left <= Number.EPSILON * Math.abs(start[0]) * diagonal) return m;
  }
}

function sweep(it: Iteration, first: number, begin: number, last: number): void {
  const { h, n, z, reflectors } = it;
  const top = z === null ? first : 0;
  const right = z === null ? last : n - 1;
  for (let k0 = begin; k0 < last; k0 += window) {
    const end = Math.min(k0 + window, last);
    const short = end === last;
    const colEnd = Math.min(end + 1, last);
    for (let k = k0; k < end; k++) chase(it, first, begin, last, k, k0, colEnd);
    reflectVectors(h, (colEnd + 1) * n, n, right - colEnd, reflectors, k0, end, short);
    reflectColumns(h, n, top, k0, reflectors, k0, end, short);
  }
  if (z !== null) reflectVectors(z, 0, n, z.length / n, reflectors, begin, last, true);
}

// Makes reflector k and applies it within the window: rows k0 …, columns up to colEnd.
function chase(
  it: Iteration,
  first: number,
  begin: number,
  last: number,
  k: number,
  k0: number,
  colEnd: number,
): void {
  const { h, n, start, reflectors } = it;
  const { tau, v, w } = reflectors;
  const three = k + 2 <= last;
  const before = k + (k - 1) * n;
  const x = k === begin ? start[0] : h[before];
  const y = k === begin ? start[1] : h[before + 1];
  const s = k === begin ? start[2] : three ? h[before + 2] : 0;
  const tail = y * y + s * s;
  let beta = x;
  tau[k] = v[k] = w[k] = 0;
  if (tail !== 0) {
    const norm = Math.sqrt(x * x + tail);
    beta = x > 0 ? -norm : norm;
    tau[k] = (beta - x) / beta;
    v[k] = y / (x - beta);
    w[k] = s / (x - beta);
  }
  if (k > begin) {
    h[before] = beta;
    h[before + 1] = 0;
    if (three) h[before + 2] = 0;
  } else if (begin > first) {
    h[before] *= 1 - tau[k];
  }
  if (three) reflectInWindow(h, n, tau[k], v[k], w[k], k, k0, colEnd, Math.min(k + 3, last));
  else reflectTwoInWindow(h, n, tau[k], v[k], k, k0, colEnd, last);
}

function reflectInWindow(
  h: Float64Array,
  n: number,
  t: number,
  v: number,
  w: number,
  k: number,
  k0: number,
  colEnd: number,
  rowEnd: number,
): void {
  for (let j = k; j <= colEnd; j++) {
    const at = k + j * n;
    const sum = (h[at] + v * h[at + 1] + w * h[at + 2]) * t;
    h[at] -= sum;
    h[at + 1] -= sum * v;
    h[at + 2] -= sum * w;
  }
  const p0 = k * n;
  const p1 = p0 + n;
  const p2 = p1 + n;
  for (let i = k0; i <= rowEnd; i++) {
    const sum = (h[p0 + i] + v * h[p1 + i] + w * h[p2 + i]) * t;
    h[p0 + i] -= sum;
    h[p1 + i] -= sum * v;
    h[p2 + i] -= sum * w;
  }
}

function reflectTwoInWindow(
  h: Float64Array,
  n: number,
  t: number,
  v: number,
  k: number,
  k0: number,
  colEnd: number,
  last: number,
): void {
  for (let j = k; j <= colEnd; j++) {
    const at = k + j * n;
    const sum = (h[at] + v * h[at + 1]) * t;
    h[at] -= sum;
    h[at + 1] -= sum * v;
  }
  const p0 = k * n;
  const p1 = p0 + n;
  for (let i = k0; i <= last; i++) {
    const sum = (h[p0 + i] + v * h[p1 + i]) * t;
    h[p0 + i] -= sum;
    h[p1 + i] -= sum * v;
  }
}

/** Standardises the 2×2 block at rows i, i + 1 and takes its two eigenvalues. */
function deflatePair(it: Iteration, i: number, re: Float64Array, im: Float64Array): void {
  const { h, n, z, pair } = it;
  const p = i * n;
  const q = p + n;
  pair.a = h[p + i];
  pair.b = h[q + i];
  pair.c = h[p + i + 1];
  pair.d = h[q + i + 1];
  standardisePair(pair);
  const { a, b, c, d, cosine, sine } = pair;
  const root = c === 0 ? 0 : Math.sqrt(Math.abs(b)) * Math.sqrt(Math.abs(c));
  re[i] = a;
  re[i + 1] = d;
  im[i] = root;
  im[i + 1] = root === 0 ? 0 : -root;
  if (z === null) return;
  h[p + i] = a;
  h[q + i] = b;
  h[p + i + 1] = c;
  h[q + i + 1] = d;
  rotateEntries(h, i + (i + 2) * n, i + 1 + (i + 2) * n, n, n - i - 2, cosine, sine);
  rotateEntries(h, p, q, 1, i, cosine, sine);
  rotateEntries(z, i, i + 1, n, z.length / n, cosine, sine);
}

function rotateEntries(
  x: Float64Array,
  p: number,
  q: number,
  step: number,
  count: number,
  cosine: number,
  sine: number,
): void {
  for (let c = 0; c < count; c++) {
    const a = x[p + c * step];
    const b = x[q + c * step];
    x[p + c * step] = cosine * a + sine * b;
    x[q + c * step] = cosine * b - sine * a;
  }
}
