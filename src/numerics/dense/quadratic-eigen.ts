import { NumericalError } from "../../errors.js";
import { biorthogonalise } from "./biorthogonal.js";
import { eigen, eigenvalues } from "./eigen.js";
import { factorDense } from "./lu.js";
import type { ComplexMatrix, DenseMatrix } from "./matrix.js";
import { complexZeros, zeros } from "./matrix.js";

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
export interface QuadraticEigen {
  readonly shift: number;
  readonly thetaRe: Float64Array;
  readonly thetaIm: Float64Array;
  /** λ; ±Infinity where θ vanishes. Conjugate pairs adjacent, positive imaginary part first. */
  readonly re: Float64Array;
  readonly im: Float64Array;
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
): { readonly re: Float64Array; readonly im: Float64Array } {
  const { companion, shift: used } = shiftedCompanion(m, c, s, shift);
  const theta = eigenvalues(companion);
  return fromTheta(theta.re, theta.im, used);
}

/** Values and both sets of vectors. Throws `NumericalError` when no real shift makes P(s₀) regular. */
export function quadraticEigen(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  shift: number,
): QuadraticEigen {
  const n = m.rows;
  const { companion, inverse, shift: used } = shiftedCompanion(m, c, s, shift);
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
  return {
    shift: used,
    thetaRe,
    thetaIm,
    ...fromTheta(thetaRe, thetaIm, used),
    right: x,
    left: z,
    defective,
  };
}

/**
 * W = (A − s₀E)⁻¹E for A = [0 I; −S −C], E = diag(I, M), second block row and column scaled by s₀:
 * W = [−A₁ −A₂; I/s₀ − A₁  −A₂] with A₁ = P(s₀)⁻¹(C + s₀M), A₂ = s₀P(s₀)⁻¹M.
 */
function shiftedCompanion(m: DenseMatrix, c: DenseMatrix, s: DenseMatrix, wanted: number) {
  const n = m.rows;
  // An irrational factor: a shift that happens to be an eigenvalue is left for good.
  for (let attempt = 0, shift = wanted; attempt < 6; attempt++, shift *= Math.SQRT2 * 1.1) {
    const p = zeros(n, n);
    for (let q = 0; q < n * n; q++) p.values[q] = shift * (shift * m.values[q] + c.values[q]) + s.values[q];
    const lu = factorDense(p);
    if (n > 0 && !(lu.pivotRatio > 1e-15)) continue;
    const inverse = zeros(n, n);
    for (let i = 0; i < n; i++) inverse.values[i * (n + 1)] = 1;
    lu.solveInPlace(inverse);
    const a1 = zeros(n, n);
    const a2 = zeros(n, n);
    for (let q = 0; q < n * n; q++) {
      a1.values[q] = c.values[q] + shift * m.values[q];
      a2.values[q] = shift * m.values[q];
    }
    lu.solveInPlace(a1);
    lu.solveInPlace(a2);
    return { companion: blockCompanion(a1, a2, shift), inverse, shift };
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
const infiniteBelow = 1e-7;

function fromTheta(thetaRe: Float64Array, thetaIm: Float64Array, shift: number) {
  const re = new Float64Array(thetaRe.length);
  const im = new Float64Array(thetaRe.length);
  for (let j = 0; j < re.length; j++) {
    const size = thetaRe[j] * thetaRe[j] + thetaIm[j] * thetaIm[j];
    const infinite = Math.sqrt(size) * shift < infiniteBelow;
    re[j] = infinite ? Number.NEGATIVE_INFINITY : shift + thetaRe[j] / size;
    im[j] = infinite ? 0 : -thetaIm[j] / size;
  }
  return { re, im };
}
