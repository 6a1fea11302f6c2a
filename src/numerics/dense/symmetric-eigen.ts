/** Eigenvalues and eigenvectors of real symmetric matrices. */

import { invariant } from "../../errors.js";
import { powerOfTwoAbove, requireFiniteMaximum } from "./finite.js";
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
  const rows = transformation(work, n, tau);
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
  /** Reflector k, its leading 1 written out, in rows k + 1 … of column k. */
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
  const work = a.values.map((x) => x / scale);
  const d = new Float64Array(n);
  const e = new Float64Array(n);
  const tau = new Float64Array(n);
  const y = new Float64Array(n);
  for (let k = 0; k < n; k++) {
    d[k] = work[k + k * n];
    if (k === n - 1) break;
    reflectColumn(work, n, k, e, tau);
    if (tau[k] !== 0) updateTrailing(work, n, k, tau[k], y);
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

// A ← H A H = A − v wᵀ − w vᵀ on the lower triangle of rows and columns k + 1 …,
// w = τ A v − ½ τ² (vᵀ A v) v.
function updateTrailing(work: Float64Array, n: number, k: number, tau: number, w: Float64Array): void {
  const v = k * n;
  w.fill(0, k + 1);
  for (let j = k + 1; j < n; j++) {
    const at = j * n;
    const vj = work[v + j];
    let sum = work[at + j] * vj;
    for (let i = j + 1; i < n; i++) {
      const x = work[at + i];
      w[i] += x * vj;
      sum += x * work[v + i];
    }
    w[j] += sum;
  }
  let inner = 0;
  for (let i = k + 1; i < n; i++) inner += w[i] * work[v + i];
  const half = 0.5 * tau * tau * inner;
  for (let i = k + 1; i < n; i++) w[i] = tau * w[i] - half * work[v + i];
  for (let j = k + 1; j < n; j++) {
    const at = j * n;
    const vj = work[v + j];
    const wj = w[j];
    for (let i = j; i < n; i++) work[at + i] -= work[v + i] * wj + w[i] * vj;
  }
}

/** Q with row i at `i * n`, made by applying the reflectors backwards to the identity. */
function transformation(work: Float64Array, n: number, tau: Float64Array): Float64Array {
  const q = new Float64Array(n * n);
  for (let i = 0; i < n; i++) q[i + i * n] = 1;
  for (let k = n - 3; k >= 0; k--) {
    if (tau[k] === 0) continue;
    const v = k * n;
    for (let j = k + 1; j < n; j++) {
      const at = j * n;
      let sum = 0;
      for (let i = k + 1; i < n; i++) sum += work[v + i] * q[at + i];
      sum *= tau[k];
      for (let i = k + 1; i < n; i++) q[at + i] -= sum * work[v + i];
    }
  }
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < j; i++) {
      const kept = q[i + j * n];
      q[i + j * n] = q[j + i * n];
      q[j + i * n] = kept;
    }
  }
  return q;
}
