/** Eigenvalues and eigenvectors of real symmetric matrices. */

import { invariant } from "../../errors.js";
import { powerOfTwoAbove, requireFiniteMaximum } from "./finite.js";
import { hessenbergBasis } from "./hessenberg.js";
import { type DenseMatrix, zeros } from "./matrix.js";
import { tridiagonalQl } from "./tridiagonal-eigen.js";

/** A = X Λ Xᵀ. */
export interface SymmetricEigen {
  /** Ascending. */
  readonly values: Float64Array;
  /** Orthonormal columns, in the order of the values. */
  readonly vectors: DenseMatrix;
}

/**
 * All eigenvalues and eigenvectors by Householder tridiagonalisation and
 * implicit QL; errors a few eps·‖A‖. About 9 n³ operations.
 *
 * @param a - n×n; only the lower triangle is read.
 * @throws NumericalError `numerics.not-finite`.
 */
export function symmetricEigen(a: DenseMatrix): SymmetricEigen {
  const n = a.rows;
  const { work, scale, d, e, tau } = tridiagonalise(a);
  const rows = hessenbergBasis(work, n, tau);
  tridiagonalQl(d, e, n, rows, n);

  const order = Int32Array.from(d.keys()).sort((i, j) => d[i] - d[j]);
  const values = new Float64Array(n);
  const vectors = zeros(n, n);
  for (let j = 0; j < n; j++) {
    const from = order[j];
    values[j] = d[from] * scale;
    for (let i = 0; i < n; i++) vectors.values[i + j * n] = rows[i * n + from];
  }
  return { values, vectors };
}

/** The eigenvalues only, ascending; as `symmetricEigen` otherwise, about 4/3 n³ operations. */
export function symmetricEigenvalues(a: DenseMatrix): Float64Array {
  const { scale, d, e } = tridiagonalise(a);
  tridiagonalQl(d, e, a.rows, null, 0);
  for (let i = 0; i < d.length; i++) d[i] *= scale;
  return d.sort();
}

interface Tridiagonal {
  /** Reflector k in rows k + 1 … of column k, as `hessenbergBasis` reads it. */
  readonly work: Float64Array;
  /** The matrix was divided by this before. */
  readonly scale: number;
  readonly d: Float64Array;
  readonly e: Float64Array;
  readonly tau: Float64Array;
}

/** A / scale = Q T Qᵀ with Q = H₀ H₁ …, H = I − τ v vᵀ. */
function tridiagonalise(a: DenseMatrix): Tridiagonal {
  invariant(a.rows === a.cols, `eigenvalues of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const scale = powerOfTwoAbove(requireFiniteMaximum(a.values, "A symmetric matrix"));
  const work = a.values.slice();
  for (let i = 0; i < work.length; i++) work[i] /= scale;
  const d = new Float64Array(n);
  const e = new Float64Array(n);
  const tau = new Float64Array(n);
  let w = new Float64Array(n);
  let wNext = new Float64Array(n);
  for (let k = 0; k < n; k++) {
    // Column k is brought up to date first, for it holds the next reflector; the rest follows on the way.
    if (k > 0) updateColumn(work, n, k, w);
    d[k] = work[k + k * n];
    if (k === n - 1) break;
    reflectColumn(work, n, k, e, tau);
    passTrailing(work, n, k, tau[k], w, wNext);
    [w, wNext] = [wNext, w];
  }
  return { work, scale, d, e, tau };
}

function reflectColumn(work: Float64Array, n: number, k: number, e: Float64Array, tau: Float64Array): void {
  const at = k * n;
  let tail = 0;
  for (let i = k + 2; i < n; i++) tail += work[at + i] * work[at + i];
  const head = work[at + k + 1];
  if (tail === 0) {
    e[k] = head;
    return;
  }
  const norm = Math.sqrt(head * head + tail);
  const beta = head > 0 ? -norm : norm;
  e[k] = beta;
  tau[k] = (beta - head) / beta;
  work[at + k + 1] = 1;
  for (let i = k + 2; i < n; i++) work[at + i] /= head - beta;
}

// With v the reflector in column k − 1, whose w is known: A ← A − v wᵀ − w vᵀ in column k.
function updateColumn(work: Float64Array, n: number, k: number, w: Float64Array): void {
  const v = (k - 1) * n;
  const at = k * n;
  const vk = work[v + k];
  const wk = w[k];
  for (let i = k; i < n; i++) work[at + i] -= work[v + i] * wk + w[i] * vk;
}

// The same in columns k + 1 …, and on the way u = A x for the reflector x in column k; then
// w = τ u − ½ τ² (xᵀ u) x, for H A H = A − x wᵀ − w xᵀ. Lower triangle only.
function passTrailing(
  work: Float64Array,
  n: number,
  k: number,
  tau: number,
  w: Float64Array,
  wNext: Float64Array,
): void {
  // Before the first reflector there is nothing to bring up to date: w is zero, and v any column.
  const v = Math.max(0, k - 1) * n;
  const x = k * n;
  wNext.fill(0);
  let j = k + 1;
  for (; j + 1 < n; j += 2) passColumnPair(work, n, j, v, x, w, wNext);
  if (j < n) {
    const at = j + j * n;
    work[at] -= 2 * work[v + j] * w[j];
    wNext[j] += work[at] * work[x + j];
  }
  let inner = 0;
  for (let i = k + 1; i < n; i++) inner += wNext[i] * work[x + i];
  const half = 0.5 * tau * tau * inner;
  for (let i = k + 1; i < n; i++) wNext[i] = tau * wNext[i] - half * work[x + i];
}

// Columns j and j + 1 of the lower triangle; an entry below the diagonal serves its mirror image too.
function passColumnPair(
  work: Float64Array,
  n: number,
  j: number,
  v: number,
  x: number,
  w: Float64Array,
  wNext: Float64Array,
): void {
  const p = j * n;
  const q = p + n;
  const v0 = work[v + j];
  const v1 = work[v + j + 1];
  const w0 = w[j];
  const w1 = w[j + 1];
  const x0 = work[x + j];
  const x1 = work[x + j + 1];
  const top = work[p + j] - 2 * v0 * w0;
  const side = work[p + j + 1] - (v1 * w0 + w1 * v0);
  const corner = work[q + j + 1] - 2 * v1 * w1;
  work[p + j] = top;
  work[p + j + 1] = side;
  work[q + j + 1] = corner;
  let s0 = top * x0 + side * x1;
  let s1 = side * x0 + corner * x1;
  for (let i = j + 2; i < n; i++) {
    const vi = work[v + i];
    const wi = w[i];
    const xi = work[x + i];
    const a0 = work[p + i] - (vi * w0 + wi * v0);
    const a1 = work[q + i] - (vi * w1 + wi * v1);
    work[p + i] = a0;
    work[q + i] = a1;
    wNext[i] += a0 * x0 + a1 * x1;
    s0 += a0 * xi;
    s1 += a1 * xi;
  }
  wNext[j] += s0;
  wNext[j + 1] += s1;
}
