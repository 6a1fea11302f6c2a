/** Reduction of a real square matrix to upper Hessenberg form. */

/**
 * A = Q H Qᵀ with Q = H₀ H₁ … Hₙ₋₃, Hₖ = I − τₖ v vᵀ. Each reflector acts as
 * A ← A − y vᵀ − v zᵀ, and this update is merged with the products A v and Aᵀ v
 * of the next reflector, so that every step passes over the matrix once.
 *
 * @param a - A, n×n by columns; on return H on and above the subdiagonal, and in
 *   column k below it entries k + 2 … of reflector k (entry k + 1 is 1).
 * @param tau - Filled with τₖ, length n.
 */
export function reduceToHessenberg(a: Float64Array, n: number, tau: Float64Array): void {
  let v = new Float64Array(n);
  let y = new Float64Array(n);
  let z = new Float64Array(n);
  let vNext = new Float64Array(n);
  let yNext = new Float64Array(n);
  let zNext = new Float64Array(n);
  tau.fill(0);
  for (let k = 0; k < n - 2; k++) {
    updateColumn(a, k * n, n, y, v, v[k], z[k]);
    tau[k] = reflector(a, n, k, vNext);
    yNext.fill(0);
    let j = k + 1;
    for (; j + 1 < n; j += 2) passColumnPair(a, n, j, k, v, y, z, vNext, yNext, zNext);
    if (j < n) passColumn(a, n, j, k, v, y, z, vNext, yNext, zNext);
    finishUpdate(n, k, tau[k], vNext, yNext, zNext);
    [v, vNext] = [vNext, v];
    [y, yNext] = [yNext, y];
    [z, zNext] = [zNext, z];
  }
  for (let j = Math.max(0, n - 2); j < n; j++) updateColumn(a, j * n, n, y, v, v[j], z[j]);
}

function updateColumn(
  a: Float64Array,
  at: number,
  n: number,
  y: Float64Array,
  v: Float64Array,
  vj: number,
  zj: number,
): void {
  for (let i = 0; i < n; i++) a[at + i] -= y[i] * vj + v[i] * zj;
}

// Makes the reflector that clears column k below its subdiagonal; v is zero up to k.
function reflector(a: Float64Array, n: number, k: number, v: Float64Array): number {
  const at = k * n;
  v.fill(0);
  let tail = 0;
  for (let i = k + 2; i < n; i++) tail += a[at + i] * a[at + i];
  if (tail === 0) return 0;
  const head = a[at + k + 1];
  const norm = Math.sqrt(head * head + tail);
  const beta = head > 0 ? -norm : norm;
  const divisor = head - beta;
  v[k + 1] = 1;
  a[at + k + 1] = beta;
  for (let i = k + 2; i < n; i++) {
    const x = a[at + i] / divisor;
    v[i] = x;
    a[at + i] = x;
  }
  return (beta - head) / beta;
}

// y ← τ A v and z ← τ Aᵀ v − τ (vᵀ y) v.
function finishUpdate(
  n: number,
  k: number,
  tau: number,
  v: Float64Array,
  y: Float64Array,
  z: Float64Array,
): void {
  let inner = 0;
  for (let i = 0; i < n; i++) {
    y[i] *= tau;
    inner += y[i] * v[i];
  }
  for (let j = k + 1; j < n; j++) z[j] = tau * (z[j] - inner * v[j]);
}

// Brings columns j and j + 1 up to date and takes their share of A v and Aᵀ v for the next v.
function passColumnPair(
  a: Float64Array,
  n: number,
  j: number,
  k: number,
  v: Float64Array,
  y: Float64Array,
  z: Float64Array,
  vNext: Float64Array,
  yNext: Float64Array,
  zNext: Float64Array,
): void {
  const p = j * n;
  const q = p + n;
  const v0 = v[j];
  const v1 = v[j + 1];
  const z0 = z[j];
  const z1 = z[j + 1];
  const u0 = vNext[j];
  const u1 = vNext[j + 1];
  // Above row k both v are zero.
  for (let i = 0; i < k; i++) {
    const yi = y[i];
    const x0 = a[p + i] - yi * v0;
    const x1 = a[q + i] - yi * v1;
    a[p + i] = x0;
    a[q + i] = x1;
    yNext[i] += x0 * u0 + x1 * u1;
  }
  let s0 = 0;
  let s1 = 0;
  for (let i = k; i < n; i++) {
    const yi = y[i];
    const vi = v[i];
    const ui = vNext[i];
    const x0 = a[p + i] - (yi * v0 + vi * z0);
    const x1 = a[q + i] - (yi * v1 + vi * z1);
    a[p + i] = x0;
    a[q + i] = x1;
    yNext[i] += x0 * u0 + x1 * u1;
    s0 += x0 * ui;
    s1 += x1 * ui;
  }
  zNext[j] = s0;
  zNext[j + 1] = s1;
}

function passColumn(
  a: Float64Array,
  n: number,
  j: number,
  k: number,
  v: Float64Array,
  y: Float64Array,
  z: Float64Array,
  vNext: Float64Array,
  yNext: Float64Array,
  zNext: Float64Array,
): void {
  const p = j * n;
  let sum = 0;
  for (let i = 0; i < n; i++) {
    const x = a[p + i] - (y[i] * v[j] + v[i] * z[j]);
    a[p + i] = x;
    yNext[i] += x * vNext[j];
    if (i > k) sum += x * vNext[i];
  }
  zNext[j] = sum;
}

/** Qᵀ by columns (row i of Q stands at `i * n`), from what `reduceToHessenberg`, or a tridiagonalisation, left. */
export function hessenbergBasis(a: Float64Array, n: number, tau: Float64Array): Float64Array {
  const q = new Float64Array(n * n);
  for (let i = 0; i < n; i++) q[i + i * n] = 1;
  const v = new Float64Array(n);
  for (let k = n - 3; k >= 0; k--) {
    if (tau[k] === 0) continue;
    v[k + 1] = 1;
    for (let i = k + 2; i < n; i++) v[i] = a[k * n + i];
    let j = k + 1;
    for (; j + 1 < n; j += 2) reflectColumnPair(q, j * n, n, k + 1, tau[k], v);
    if (j < n) reflectColumn(q, j * n, n, k + 1, tau[k], v);
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

/** x ← Qᵀ x for every vector of length n that stands in `x`, Q as in `hessenbergBasis`. */
export function toHessenbergBasis(a: Float64Array, n: number, tau: Float64Array, x: Float64Array): void {
  const v = new Float64Array(n);
  for (let k = 0; k < n - 2; k++) {
    if (tau[k] === 0) continue;
    v[k + 1] = 1;
    for (let i = k + 2; i < n; i++) v[i] = a[k * n + i];
    let at = 0;
    for (; at + n < x.length; at += 2 * n) reflectColumnPair(x, at, n, k + 1, tau[k], v);
    if (at < x.length) reflectColumn(x, at, n, k + 1, tau[k], v);
  }
}

function reflectColumnPair(
  q: Float64Array,
  p: number,
  n: number,
  first: number,
  tau: number,
  v: Float64Array,
): void {
  const r = p + n;
  let s0 = 0;
  let s1 = 0;
  for (let i = first; i < n; i++) {
    s0 += v[i] * q[p + i];
    s1 += v[i] * q[r + i];
  }
  s0 *= tau;
  s1 *= tau;
  for (let i = first; i < n; i++) {
    q[p + i] -= s0 * v[i];
    q[r + i] -= s1 * v[i];
  }
}

function reflectColumn(
  q: Float64Array,
  p: number,
  n: number,
  first: number,
  tau: number,
  v: Float64Array,
): void {
  let sum = 0;
  for (let i = first; i < n; i++) sum += v[i] * q[p + i];
  sum *= tau;
  for (let i = first; i < n; i++) q[p + i] -= sum * v[i];
}
