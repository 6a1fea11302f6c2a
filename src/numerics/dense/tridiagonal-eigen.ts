import { NumericalError } from "../../errors.js";

const sweepsPerValue = 60;
/**
 * After so many sweeps a coupling of rounding size is dropped: among the null values of a matrix of low rank it may
 * never fall below eps of its neighbours.
 */
const patience = 20;

/**
 * Eigenvalues of a real symmetric tridiagonal matrix by implicit QL with
 * Wilkinson's shift, optionally turning vectors along.
 *
 * @param d - Diagonal, length n; on return the eigenvalues, in no order.
 * @param e - e[i] couples i and i + 1, length n (the last one unused); destroyed.
 * @param rows - `count` vectors of length n one after another, each replaced by
 *   itself times the matrix of eigenvectors: with the identity this leaves, at
 *   `i * n + j`, component i of eigenvector j. Null for values only.
 * @throws NumericalError `numerics.no-convergence`, not seen on finite data.
 *
 * Source: Parlett, The Symmetric Eigenvalue Problem, SIAM 1998, chapter 8.
 */
export function tridiagonalQl(
  d: Float64Array,
  e: Float64Array,
  n: number,
  rows: Float64Array | null,
  count: number,
): void {
  const cosine = new Float64Array(rows === null ? 0 : n);
  const sine = new Float64Array(rows === null ? 0 : n);
  const largest = d.subarray(0, n).reduce((most, value) => Math.max(most, Math.abs(value)), 0);
  for (let l = 0; l < n; l++) {
    for (let sweep = 0; ; sweep++) {
      const floor = sweep < patience ? 0 : largest;
      const m = endOfBlock(d, e, l, n, floor);
      if (m === l) break;
      if (sweep === sweepsPerValue) {
        throw new NumericalError(
          "numerics.no-convergence",
          `The symmetric QL iteration did not settle on value ${l + 1} of ${n}.`,
          "Check the matrices for entries that are not finite.",
        );
      }
      const top = qlSweep(d, e, l, m, cosine, sine, rows !== null);
      if (rows !== null) rotateRows(rows, n, count, top, m, cosine, sine);
    }
  }
}

// The first index from l on whose coupling to the next is negligible.
function endOfBlock(d: Float64Array, e: Float64Array, l: number, n: number, floor: number): number {
  let m = l;
  while (m < n - 1) {
    if (Math.abs(e[m]) <= Number.EPSILON * Math.max(floor, Math.abs(d[m]) + Math.abs(d[m + 1]))) break;
    m++;
  }
  return m;
}

// One sweep from m up to l; returns the index where it ended (above l after an exact split).
function qlSweep(
  d: Float64Array,
  e: Float64Array,
  l: number,
  m: number,
  cosine: Float64Array,
  sine: Float64Array,
  keep: boolean,
): number {
  let g = (d[l + 1] - d[l]) / (2 * e[l]);
  let r = Math.hypot(g, 1);
  g = d[m] - d[l] + e[l] / (g + (g < 0 ? -r : r));
  let s = 1;
  let c = 1;
  let p = 0;
  for (let i = m - 1; i >= l; i--) {
    const f = s * e[i];
    const b = c * e[i];
    r = Math.sqrt(f * f + g * g);
    e[i + 1] = r;
    if (r === 0) {
      d[i + 1] -= p;
      e[m] = 0;
      return i + 1;
    }
    s = f / r;
    c = g / r;
    g = d[i + 1] - p;
    const t = (d[i] - g) * s + 2 * c * b;
    p = s * t;
    d[i + 1] = g + p;
    g = c * t - b;
    if (keep) {
      cosine[i] = c;
      sine[i] = s;
    }
  }
  d[l] -= p;
  e[l] = g;
  e[m] = 0;
  return l;
}

// Rotations m − 1 down to `top` act on neighbouring entries of each row; four rows
// at a time hide the latency of the chain that runs through one row.
function rotateRows(
  rows: Float64Array,
  n: number,
  count: number,
  top: number,
  m: number,
  cosine: Float64Array,
  sine: Float64Array,
): void {
  let row = 0;
  for (; row + 3 < count; row += 4) {
    const p0 = row * n;
    const p1 = p0 + n;
    const p2 = p1 + n;
    const p3 = p2 + n;
    let f0 = rows[p0 + m];
    let f1 = rows[p1 + m];
    let f2 = rows[p2 + m];
    let f3 = rows[p3 + m];
    for (let i = m - 1; i >= top; i--) {
      const c = cosine[i];
      const s = sine[i];
      const x0 = rows[p0 + i];
      const x1 = rows[p1 + i];
      const x2 = rows[p2 + i];
      const x3 = rows[p3 + i];
      rows[p0 + i + 1] = s * x0 + c * f0;
      rows[p1 + i + 1] = s * x1 + c * f1;
      rows[p2 + i + 1] = s * x2 + c * f2;
      rows[p3 + i + 1] = s * x3 + c * f3;
      f0 = c * x0 - s * f0;
      f1 = c * x1 - s * f1;
      f2 = c * x2 - s * f2;
      f3 = c * x3 - s * f3;
    }
    rows[p0 + top] = f0;
    rows[p1 + top] = f1;
    rows[p2 + top] = f2;
    rows[p3 + top] = f3;
  }
  for (; row < count; row++) {
    const p0 = row * n;
    let f0 = rows[p0 + m];
    for (let i = m - 1; i >= top; i--) {
      const x0 = rows[p0 + i];
      rows[p0 + i + 1] = sine[i] * x0 + cosine[i] * f0;
      f0 = cosine[i] * x0 - sine[i] * f0;
    }
    rows[p0 + top] = f0;
  }
}
