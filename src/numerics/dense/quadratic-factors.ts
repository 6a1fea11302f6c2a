import { eigenFactors } from "./eigen-factors.js";
import { type ComplexMatrix, type DenseMatrix, zeros } from "./matrix.js";
import { polesOf, type QuadraticPoles, shiftedCompanion } from "./quadratic-companion.js";

/** P(s) as seen through its channels: C P(s)⁻¹ B = (C X) diag(1 / (1 − (s − s₀) θ_j)) (Z B). */
export interface QuadraticFactors extends QuadraticPoles {
  /** C X, p×2n. */
  readonly outputs: ComplexMatrix;
  /** Z B, 2n×m. */
  readonly inputs: ComplexMatrix;
}

/**
 * Poles and residues of C P(s)⁻¹ B without the vectors themselves: see `QuadraticEigen`, whose eigenvalues and
 * order these are, and `eigenFactors`, whose caveat on defective eigenvalues holds here too.
 *
 * @param b - B, n×m.
 * @param cTransposed - Cᵀ, n×p.
 * @throws as `quadraticEigen`.
 */
export function quadraticFactors(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  shift: number,
  b: DenseMatrix,
  cTransposed: DenseMatrix,
): QuadraticFactors {
  const n = m.rows;
  const { companion, factor, shift: used } = shiftedCompanion(m, c, s, shift);
  const solved = { ...b, values: b.values.slice() };
  factor.solveInPlace(solved);
  // x is the upper half of a companion's right vector, and Z B = (Y₁ + Y₂)ᴴ P(s₀)⁻¹ B.
  const { re, im, outputs, inputs } = eigenFactors(
    companion,
    stacked(solved, solved, n),
    stacked(cTransposed, zeros(n, cTransposed.cols), n),
  );
  return { ...polesOf(re, im, used), outputs, inputs };
}

function stacked(upper: DenseMatrix, lower: DenseMatrix, n: number): DenseMatrix {
  const out = zeros(2 * n, upper.cols);
  for (let k = 0; k < upper.cols; k++) {
    out.values.set(upper.values.subarray(k * n, (k + 1) * n), 2 * k * n);
    out.values.set(lower.values.subarray(k * n, (k + 1) * n), (2 * k + 1) * n);
  }
  return out;
}
