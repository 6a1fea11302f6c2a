import type { ComplexMatrix, ComplexVector } from "./matrix.js";

/** A = Q T Qᴴ with T real tridiagonal. */
export interface HermitianTridiagonal {
  readonly d: Float64Array;
  /** e[i] couples i and i + 1, not negative; the last entry is 0. */
  readonly e: Float64Array;
  /** Column k holds the reflector Hₖ = I − τₖ v vᴴ of step k in rows k + 1 …; Q = H₀ H₁ … P, P of phases. */
  readonly vectors: ComplexMatrix;
  readonly tau: Float64Array;
}

/**
 * Reduces a Hermitian matrix to real tridiagonal form by complex reflectors;
 * `a`, n×n with both triangles filled, is overwritten and becomes `vectors`.
 * The phases of the subdiagonal are left in the (unused) row 0 of columns 1 … .
 */
export function hermitianTridiagonal(a: ComplexMatrix): HermitianTridiagonal {
  const { rows: n, re, im } = a;
  const d = new Float64Array(n);
  const e = new Float64Array(n);
  const tau = new Float64Array(n);
  const yRe = new Float64Array(n);
  const yIm = new Float64Array(n);
  let phaseRe = 1;
  let phaseIm = 0;
  for (let k = 0; k < n; k++) {
    const at = k * n;
    d[k] = re[at + k];
    if (k > 0) {
      re[at] = phaseRe;
      im[at] = phaseIm;
    }
    if (k === n - 1) break;
    let tail = 0;
    for (let i = k + 2; i < n; i++) tail += re[at + i] * re[at + i] + im[at + i] * im[at + i];
    const headRe = re[at + k + 1];
    const headIm = im[at + k + 1];
    const head = Math.hypot(headRe, headIm);
    const norm = Math.sqrt(head * head + tail);
    e[k] = norm;
    if (norm === 0) continue;
    // Without a tail there is nothing to reflect and the entry keeps its phase; else it becomes −norm · phase.
    let cosine = head === 0 ? 1 : headRe / head;
    let sine = head === 0 ? 0 : headIm / head;
    if (tail > 0) {
      re[at + k + 1] = headRe + norm * cosine;
      im[at + k + 1] = headIm + norm * sine;
      tau[k] = 1 / (norm * (norm + head));
      updateTrailing(a, k, tau[k], yRe, yIm);
      cosine = -cosine;
      sine = -sine;
    }
    const turned = phaseRe * cosine - phaseIm * sine;
    phaseIm = phaseRe * sine + phaseIm * cosine;
    phaseRe = turned;
  }
  return { d, e, vectors: a, tau };
}

// A ← H A H = A − v wᴴ − w vᴴ on the lower triangle, w = τ A v − ½ τ² (vᴴ A v) v.
function updateTrailing(
  a: ComplexMatrix,
  k: number,
  tau: number,
  wRe: Float64Array,
  wIm: Float64Array,
): void {
  const { rows: n, re, im } = a;
  const v = k * n;
  wRe.fill(0);
  wIm.fill(0);
  for (let j = k + 1; j < n; j++) {
    const at = j * n;
    const vRe = re[v + j];
    const vIm = im[v + j];
    let sRe = re[at + j] * vRe;
    let sIm = re[at + j] * vIm;
    for (let i = j + 1; i < n; i++) {
      const xRe = re[at + i];
      const xIm = im[at + i];
      wRe[i] += xRe * vRe - xIm * vIm;
      wIm[i] += xRe * vIm + xIm * vRe;
      sRe += xRe * re[v + i] + xIm * im[v + i];
      sIm += xRe * im[v + i] - xIm * re[v + i];
    }
    wRe[j] += sRe;
    wIm[j] += sIm;
  }
  let inner = 0;
  for (let i = k + 1; i < n; i++) inner += wRe[i] * re[v + i] + wIm[i] * im[v + i];
  const half = 0.5 * tau * tau * inner;
  for (let i = k + 1; i < n; i++) {
    wRe[i] = tau * wRe[i] - half * re[v + i];
    wIm[i] = tau * wIm[i] - half * im[v + i];
  }
  for (let j = k + 1; j < n; j++) {
    const at = j * n;
    const vRe = re[v + j];
    const vIm = im[v + j];
    const uRe = wRe[j];
    const uIm = wIm[j];
    for (let i = j; i < n; i++) {
      re[at + i] -= re[v + i] * uRe + im[v + i] * uIm + (wRe[i] * vRe + wIm[i] * vIm);
      im[at + i] -= im[v + i] * uRe - re[v + i] * uIm + (wIm[i] * vRe - wRe[i] * vIm);
    }
  }
}

/** x ← Q x with what `hermitianTridiagonal` left in `vectors`. */
export function applyReflectors(
  { rows: n, re, im }: ComplexMatrix,
  tau: Float64Array,
  x: ComplexVector,
): void {
  for (let i = 1; i < n; i++) {
    const xRe = x.re[i];
    const xIm = x.im[i];
    x.re[i] = xRe * re[i * n] - xIm * im[i * n];
    x.im[i] = xRe * im[i * n] + xIm * re[i * n];
  }
  for (let k = n - 2; k >= 0; k--) {
    if (tau[k] === 0) continue;
    const v = k * n;
    let sRe = 0;
    let sIm = 0;
    for (let i = k + 1; i < n; i++) {
      sRe += re[v + i] * x.re[i] + im[v + i] * x.im[i];
      sIm += re[v + i] * x.im[i] - im[v + i] * x.re[i];
    }
    sRe *= tau[k];
    sIm *= tau[k];
    for (let i = k + 1; i < n; i++) {
      x.re[i] -= sRe * re[v + i] - sIm * im[v + i];
      x.im[i] -= sRe * im[v + i] + sIm * re[v + i];
    }
  }
}
