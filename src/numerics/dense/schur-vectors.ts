/** Eigenvectors of a real quasi-triangular matrix, right and left, by substitution. */

import { PairSolver } from "./pair-solver.js";

// With T of norm 1 and vectors kept below this, no product overflows.
const bound = 1e100;
const smallestDivisor = 1e-140;

/**
 * Right eigenvectors of the quasi-triangular T, n×n by columns with
 * standardised blocks and entries below 1 in modulus: T x = λ x. Column j of the result
 * is the vector of a real eigenvalue; columns j and j + 1 are the real and
 * imaginary part of that of λ = re + i im, im > 0, of a pair. Zero below row j or j + 1, any length.
 */
export function rightSchurVectors(
  t: Float64Array,
  n: number,
  re: Float64Array,
  im: Float64Array,
): Float64Array {
  const out = new Float64Array(n * n);
  const solver = new PairSolver(smallestDivisor);
  for (let j = n - 1; j >= 0; j--) {
    if (im[j] === 0) {
      const x = out.subarray(j * n, (j + 1) * n);
      x[j] = 1;
      for (let i = 0; i < j; i++) x[i] = -t[i + j * n];
      substituteBack(t, n, j - 1, x, null, re[j], 0, solver);
    } else {
      j--;
      const x = out.subarray(j * n, (j + 1) * n);
      const y = out.subarray((j + 1) * n, (j + 2) * n);
      const upper = t[j + (j + 1) * n];
      const lower = t[j + 1 + j * n];
      if (Math.abs(upper) >= Math.abs(lower)) {
        x[j] = 1;
        y[j + 1] = im[j] / upper;
      } else {
        x[j] = -im[j] / lower;
        y[j + 1] = 1;
      }
      for (let i = 0; i < j; i++) {
        x[i] = -x[j] * t[i + j * n];
        y[i] = -y[j + 1] * t[i + (j + 1) * n];
      }
      substituteBack(t, n, j - 1, x, y, re[j], im[j], solver);
    }
  }
  return out;
}

/** Solves (T − λ) x = right-hand side in rows 0 … `from`, which x + i y holds; its entries below are scaled along. */
function substituteBack(
  t: Float64Array,
  n: number,
  from: number,
  x: Float64Array,
  y: Float64Array | null,
  re: number,
  im: number,
  solver: PairSolver,
): void {
  solver.shift(re, im);
  let j = from;
  while (j >= 0) {
    const isPair = j > 0 && t[j + (j - 1) * n] !== 0;
    const top = isPair ? j - 1 : j;
    if (isPair) {
      const at = top + top * n;
      solver.solvePair(t[at], t[at + n], t[at + 1], t[at + n + 1], x, y, top);
    } else {
      solver.solveOne(t[j + j * n], x, y, j);
    }
    limit(x, y, top, j, 0, n);
    if (isPair && y !== null) {
      subtractColumnPair(t, top * n, n, top, x[top], x[j], y[top], y[j], x, y);
    } else {
      for (let c = top; c <= j; c++) {
        subtractColumn(t, c * n, top, x[c], x);
        if (y !== null) subtractColumn(t, c * n, top, y[c], y);
      }
    }
    j = top - 1;
  }
}

function subtractColumn(t: Float64Array, at: number, rows: number, factor: number, x: Float64Array): void {
  for (let i = 0; i < rows; i++) x[i] -= factor * t[at + i];
}

// Two columns off two vectors in one pass: the usual case of a pair met by the vectors of a pair.
function subtractColumnPair(
  t: Float64Array,
  at: number,
  stride: number,
  rows: number,
  x0: number,
  x1: number,
  y0: number,
  y1: number,
  x: Float64Array,
  y: Float64Array,
): void {
  const next = at + stride;
  for (let i = 0; i < rows; i++) {
    const a = t[at + i];
    const b = t[next + i];
    x[i] -= x0 * a + x1 * b;
    y[i] -= y0 * a + y1 * b;
  }
}

// Scales the vector down when entries first … last have grown past the bound.
function limit(
  x: Float64Array,
  y: Float64Array | null,
  first: number,
  last: number,
  begin: number,
  end: number,
): void {
  let most = 0;
  for (let i = first; i <= last; i++) {
    most = Math.max(most, Math.abs(x[i]), y === null ? 0 : Math.abs(y[i]));
  }
  if (most <= bound) return;
  for (let i = begin; i < end; i++) {
    x[i] /= most;
    if (y !== null) y[i] /= most;
  }
}

/** Left eigenvectors, yᴴ T = λ yᴴ, laid out as the right ones but zero above row j. */
export function leftSchurVectors(
  t: Float64Array,
  n: number,
  re: Float64Array,
  im: Float64Array,
): Float64Array {
  const out = new Float64Array(n * n);
  const solver = new PairSolver(smallestDivisor);
  for (let j = 0; j < n; j++) {
    const x = out.subarray(j * n, (j + 1) * n);
    if (im[j] === 0) {
      x[j] = 1;
      substituteForward(t, n, j, j + 1, x, null, re[j], 0, solver);
    } else {
      const y = out.subarray((j + 1) * n, (j + 2) * n);
      const upper = t[j + (j + 1) * n];
      const lower = t[j + 1 + j * n];
      if (Math.abs(upper) >= Math.abs(lower)) {
        x[j] = im[j] / upper;
        y[j + 1] = 1;
      } else {
        x[j] = 1;
        y[j + 1] = -im[j] / lower;
      }
      // Tᵀ y = λ̄ y, hence the sign.
      substituteForward(t, n, j, j + 2, x, y, re[j], -im[j], solver);
      j++;
    }
  }
  return out;
}

/** Solves (Tᵀ − λ) x = 0 in rows `from` …, the entries `begin` to `from` − 1 given. */
function substituteForward(
  t: Float64Array,
  n: number,
  begin: number,
  from: number,
  x: Float64Array,
  y: Float64Array | null,
  re: number,
  im: number,
  solver: PairSolver,
): void {
  solver.shift(re, im);
  let j = from;
  while (j < n) {
    const isPair = j < n - 1 && t[j + 1 + j * n] !== 0;
    const last = isPair ? j + 1 : j;
    for (let c = j; c <= last; c++) {
      x[c] = -dotColumn(t, c * n, begin, j, x);
      if (y !== null) y[c] = -dotColumn(t, c * n, begin, j, y);
    }
    if (isPair) {
      const at = j + j * n;
      solver.solvePair(t[at], t[at + 1], t[at + n], t[at + n + 1], x, y, j);
    } else {
      solver.solveOne(t[j + j * n], x, y, j);
    }
    limit(x, y, j, last, begin, n);
    j = last + 1;
  }
}

function dotColumn(t: Float64Array, at: number, begin: number, end: number, x: Float64Array): number {
  let s0 = 0;
  let s1 = 0;
  let s2 = 0;
  let s3 = 0;
  let i = begin;
  for (; i + 3 < end; i += 4) {
    s0 += t[at + i] * x[i];
    s1 += t[at + i + 1] * x[i + 1];
    s2 += t[at + i + 2] * x[i + 2];
    s3 += t[at + i + 3] * x[i + 3];
  }
  for (; i < end; i++) s0 += t[at + i] * x[i];
  return s0 + s1 + (s2 + s3);
}
