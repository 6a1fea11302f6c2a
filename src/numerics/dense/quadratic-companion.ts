import { NumericalError } from "../../errors.js";
import { type DenseLu, factorDense } from "./lu.js";
import type { DenseMatrix } from "./matrix.js";
import { zeros } from "./matrix.js";

/** Eigenvalues of P(s) = s²M + sC + S by way of θ = 1/(λ − s₀). */
export interface QuadraticPoles {
  readonly shift: number;
  readonly thetaRe: Float64Array;
  readonly thetaIm: Float64Array;
  /** λ; −Infinity where θ vanishes. Conjugate pairs adjacent, positive imaginary part first. */
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** P(s₀) factored and the matrix whose eigenvalues are θ. */
export interface ShiftedCompanion {
  readonly companion: DenseMatrix;
  readonly factor: DenseLu;
  /** s₀ as used. */
  readonly shift: number;
}

/**
 * W = (A − s₀E)⁻¹E for A = [0 I; −S −C], E = diag(I, M), second block row and column scaled by s₀:
 * W = [−A₁ −A₂; I/s₀ − A₁  −A₂] with A₁ = P(s₀)⁻¹(C + s₀M), A₂ = s₀P(s₀)⁻¹M.
 */
export function shiftedCompanion(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  wanted: number,
): ShiftedCompanion {
  const n = m.rows;
  // An irrational factor: a shift that happens to be an eigenvalue is left for good.
  for (let attempt = 0, shift = wanted; attempt < 6; attempt++, shift *= Math.SQRT2 * 1.1) {
    const p = zeros(n, n);
    for (let q = 0; q < n * n; q++) p.values[q] = shift * (shift * m.values[q] + c.values[q]) + s.values[q];
    const factor = factorDense(p);
    if (n > 0 && !(factor.pivotRatio > 1e-15)) continue;
    const a1 = zeros(n, n);
    const a2 = zeros(n, n);
    for (let q = 0; q < n * n; q++) {
      a1.values[q] = c.values[q] + shift * m.values[q];
      a2.values[q] = shift * m.values[q];
    }
    factor.solveInPlace(a1);
    factor.solveInPlace(a2);
    return { companion: blockCompanion(a1, a2, shift), factor, shift };
  }
  throw new NumericalError(
    "numerics.singular-pencil",
    "P(s) is singular at every real s that was tried: the matrix pencil is not regular",
    "Run `check`: look for dofs without mass, damping and stiffness.",
  );
}

function blockCompanion(a1: DenseMatrix, a2: DenseMatrix, shift: number): DenseMatrix {
  const n = a1.rows;
  const w = zeros(2 * n, 2 * n);
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      const q = i + j * n;
      const top = i + j * 2 * n;
      w.values[top] = -a1.values[q];
      w.values[top + n] = (i === j ? 1 / shift : 0) - a1.values[q];
      w.values[top + 2 * n * n] = -a2.values[q];
      w.values[top + 2 * n * n + n] = -a2.values[q];
    }
  }
  return w;
}

/** |θ| s₀ below which an eigenvalue is infinite. */
export const infiniteBelow = 1e-7;

/** λ = s₀ + 1/θ. */
export function polesOf(thetaRe: Float64Array, thetaIm: Float64Array, shift: number): QuadraticPoles {
  const re = new Float64Array(thetaRe.length);
  const im = new Float64Array(thetaRe.length);
  for (let j = 0; j < re.length; j++) {
    const size = thetaRe[j] * thetaRe[j] + thetaIm[j] * thetaIm[j];
    const infinite = Math.sqrt(size) * shift < infiniteBelow;
    re[j] = infinite ? Number.NEGATIVE_INFINITY : shift + thetaRe[j] / size;
    im[j] = infinite ? 0 : -thetaIm[j] / size;
  }
  return { shift, thetaRe, thetaIm, re, im };
}
