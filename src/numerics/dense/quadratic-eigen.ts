import { biorthogonalise } from "./biorthogonal.js";
import { eigen, eigenvalues } from "./eigen.js";
import type { ComplexMatrix, DenseMatrix } from "./matrix.js";
import { complexZeros, zeros } from "./matrix.js";
import { infiniteBelow, polesOf, type QuadraticPoles, shiftedCompanion } from "./quadratic-companion.js";

/**
 * Eigenvalues λ of P(s) = s²M + sC + S (real n×n, M may be singular) in the form that
 * the resolvent needs,
 *
 *     P(s)⁻¹ = X diag(1 / (1 − (s − s₀) θ_j)) Z,      λ_j = s₀ + 1/θ_j,
 *
 * with X n×2n and Z 2n×n. An infinite eigenvalue has θ = 0 and is a constant term, so a
 * singular mass needs no separate treatment. θ is computed to eps, hence λ to about eps·s₀; the double
 * infinite eigenvalue of a massless, undamped dof scatters by √eps, so |θ| s₀ below 1e-7 counts as infinite.
 *
 * Source: shift-and-invert of the first companion form, Tisseur & Meerbergen, SIAM Review 43 (2001) §3.
 */
export interface QuadraticEigen extends QuadraticPoles {
  /** X: right eigenvectors in the coordinates of P. */
  readonly right: ComplexMatrix;
  /** Z = (Y₁ + Y₂)ᴴ P(s₀)⁻¹: rows are left eigenvectors yᴴ of P, scaled to the residues. */
  readonly left: ComplexMatrix;
  /** A finite eigenvalue lacks vectors: the resolvent formula fails. */
  readonly defective: boolean;
}

/** Values only; see `QuadraticEigen`. `shift` s₀ > 0 in the units of s, of the size of the |λ| that matter. */
export function quadraticEigenvalues(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  shift: number,
): QuadraticPoles {
  const { companion, shift: used } = shiftedCompanion(m, c, s, shift);
  const theta = eigenvalues(companion);
  return polesOf(theta.re, theta.im, used);
}

/** Values and both sets of vectors. Throws `NumericalError` when no real shift makes P(s₀) regular. */
export function quadraticEigen(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  shift: number,
): QuadraticEigen {
  const n = m.rows;
  const { companion, factor, shift: used } = shiftedCompanion(m, c, s, shift);
  const inverse = zeros(n, n);
  for (let i = 0; i < n; i++) inverse.values[i * (n + 1)] = 1;
  factor.solveInPlace(inverse);
  const { re: thetaRe, im: thetaIm, right, left, defective: flags } = eigen(companion);
  const least = infiniteBelow / used;
  const matched = biorthogonalise(thetaRe, thetaIm, right, left, least);
  const defective =
    !matched || flags.some((flag, j) => flag === 1 && Math.hypot(thetaRe[j], thetaIm[j]) >= least);
  const x = complexZeros(n, 2 * n);
  const z = complexZeros(2 * n, n);
  for (let j = 0; j < 2 * n; j++) {
    const from = j * 2 * n;
    x.re.set(right.re.subarray(from, from + n), j * n);
    x.im.set(right.im.subarray(from, from + n), j * n);
  }
  const sumRe = new Float64Array(n);
  const sumIm = new Float64Array(n);
  for (let j = 0; j < 2 * n; j++) {
    for (let i = 0, p = j * 2 * n; i < n; i++, p++) {
      sumRe[i] = left.re[p] + left.re[p + n];
      sumIm[i] = left.im[p] + left.im[p + n];
    }
    for (let k = 0; k < n; k++) {
      let re = 0;
      let im = 0;
      for (let i = 0, p = k * n; i < n; i++, p++) {
        re += sumRe[i] * inverse.values[p];
        im -= sumIm[i] * inverse.values[p];
      }
      z.re[j + k * 2 * n] = re;
      z.im[j + k * 2 * n] = im;
    }
  }
  return { ...polesOf(thetaRe, thetaIm, used), right: x, left: z, defective };
}
