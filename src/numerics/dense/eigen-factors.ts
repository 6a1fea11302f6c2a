import { invariant } from "../../errors.js";
import { balancedHessenberg, clearReflectors, inUnits } from "./balanced-hessenberg.js";
import { addTransposedProductInto } from "./block-kernels.js";
import type { Eigenvalues } from "./eigen.js";
import { toHessenbergBasis } from "./hessenberg.js";
import { type ComplexMatrix, complexZeros, type DenseMatrix, zeros } from "./matrix.js";
import { wholeBlock } from "./products.js";
import { realSchur } from "./real-schur.js";
import { rightSchurVectors } from "./schur-vectors.js";

/** A = X Λ X⁻¹ as seen through outputs and inputs, C f(A) B = (C X) f(Λ) (X⁻¹ B); columns of X have any length. */
export interface EigenFactors extends Eigenvalues {
  /** C X, p×n. */
  readonly outputs: ComplexMatrix;
  /** X⁻¹ B, n×m. */
  readonly inputs: ComplexMatrix;
}

/**
 * Eigenvalues of a real matrix and its eigenvectors contracted with B and C, for less than half the cost of the vectors
 * themselves: orthogonal factors act on the p + m given vectors alone, and X⁻¹ is a substitution with the
 * triangular eigenvectors of the Schur form. Eigenvalues and their order are those of `eigen`. Near
 * defective eigenvalues the factors grow and cancel, or are not finite: the caller has to test them.
 *
 * @param a - A, n×n.
 * @param b - B, n×m.
 * @param cTransposed - Cᵀ, n×p.
 * @throws as `eigenvalues`.
 */
export function eigenFactors(a: DenseMatrix, b: DenseMatrix, cTransposed: DenseMatrix): EigenFactors {
  const n = a.rows;
  invariant(b.rows === n && cTransposed.rows === n, `channels of ${b.rows} rows at order ${n}`);
  const { h: t, tau, weights, unit } = balancedHessenberg(a);
  const seen = new Float64Array(cTransposed.values.length + b.values.length);
  // C X = (C D) X_b and X⁻¹ B = X_b⁻¹ (D⁻¹ B).
  cTransposed.values.forEach((value, q) => {
    seen[q] = value * weights[q % n];
  });
  b.values.forEach((value, q) => {
    seen[cTransposed.values.length + q] = value / weights[q % n];
  });
  toHessenbergBasis(t, n, tau, seen);
  clearReflectors(t, n);
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  realSchur(t, n, seen, re, im);

  const vectors = { rows: n, cols: n, values: rightSchurVectors(t, n, re, im) };
  const turnedOutputs = { ...cTransposed, values: seen.subarray(0, cTransposed.values.length) };
  const turnedInputs = { ...b, values: seen.subarray(cTransposed.values.length) };
  const outputs = zeros(cTransposed.cols, n);
  addTransposedProductInto(
    wholeBlock(outputs),
    1,
    wholeBlock(turnedOutputs),
    wholeBlock(vectors),
    outputs.rows,
    n,
    n,
  );
  substituteInPlace(vectors, turnedInputs);
  return {
    ...inUnits(re, im, unit),
    outputs: complexColumns(outputs, im),
    inputs: complexRows(turnedInputs, im),
  };
}

/** b ← U⁻¹ b. The diagonal blocks of eigenvectors of a standardised Schur form are diagonal, so U is triangular. */
function substituteInPlace(u: DenseMatrix, b: DenseMatrix): void {
  const n = u.rows;
  const { values } = u;
  const x = b.values;
  for (let from = 0; from < x.length; from += n) {
    for (let k = n - 1; k >= 0; k--) {
      const at = k * n;
      const xk = x[from + k] / values[at + k];
      x[from + k] = xk;
      for (let i = 0; i < k; i++) x[from + i] -= xk * values[at + i];
    }
  }
}

/** Pairs of real columns u, v made u ± iv. */
function complexColumns(packed: DenseMatrix, im: Float64Array): ComplexMatrix {
  const { rows, cols, values } = packed;
  const out = complexZeros(rows, cols);
  for (let j = 0; j < cols; j++) {
    const at = j * rows;
    const isPair = im[j] !== 0;
    for (let i = at; i < at + rows; i++) {
      out.re[i] = values[i];
      if (!isPair) continue;
      out.im[i] = values[i + rows];
      out.re[i + rows] = values[i];
      out.im[i + rows] = -values[i + rows];
    }
    if (isPair) j++;
  }
  return out;
}

/** Pairs of real rows u, v made (u ∓ iv)/2: the inverse of what `complexColumns` does to columns. */
function complexRows(packed: DenseMatrix, im: Float64Array): ComplexMatrix {
  const { rows, cols, values } = packed;
  const out = complexZeros(rows, cols);
  for (let j = 0; j < rows; j++) {
    const isPair = im[j] !== 0;
    for (let q = j; q < values.length; q += rows) {
      if (!isPair) {
        out.re[q] = values[q];
        continue;
      }
      out.re[q] = 0.5 * values[q];
      out.im[q] = -0.5 * values[q + 1];
      out.re[q + 1] = out.re[q];
      out.im[q + 1] = -out.im[q];
    }
    if (isPair) j++;
  }
  return out;
}
