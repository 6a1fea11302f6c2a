/**
 * Multifrontal LDLᵀ of sparse real symmetric matrices, definite or not, with its inertia: the
 * numbers of negative, zero and positive eigenvalues, by Sylvester's law those of D.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Bunch & Kaufman, Math. Comp. 31(137), 1977.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { DenseMatrix } from "../dense/matrix.js";
import { withWorkspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { equilibrationExponents } from "./equilibration.js";
import { RealRefinement } from "./real-refinement.js";
import type { SparseMatrix, SparsePattern } from "./sparse-matrix.js";
import { SymmetricMultifrontal } from "./symmetric-multifrontal.js";
import { type SymmetricFactor, solveWithSymmetricFactor } from "./symmetric-substitution.js";

/** Numbers of negative, zero and positive eigenvalues. */
export interface Inertia {
  readonly negative: number;
  readonly zero: number;
  readonly positive: number;
}

/** S A S = L D Lᵀ, ready to solve. */
export interface SymmetricFactorisation {
  readonly order: number;
  /** Stored entries of L and D. */
  readonly nonzeros: number;
  readonly inertia: Inertia;
  /** False when a pivot was replaced or is zero to working precision, so that the counts are no proof. */
  readonly inertiaReliable: boolean;
  /**
   * B ← A⁻¹ B, refined; B is n×k. With a singular A the result is huge but finite.
   * @throws NumericalError `numerics.singular` when a value is not finite.
   */
  solveInPlace(b: DenseMatrix): SolveReport;
  /** Gives the memory of the factors to the next factorisation; this one cannot solve any more. */
  release(): void;
}

/** A pivot of at most this many machine epsilons of ‖S A S‖∞ counts as zero. */
const ZERO_PIVOT_EPSILONS = 8;

/**
 * @param values - Both triangles, in the order of the pattern that was analysed; kept for
 *   refinement, so the caller must not overwrite it.
 * @throws NumericalError `numerics.not-finite` when a value is not finite.
 */
export function factorSymmetric(
  analysis: SymbolicAnalysis,
  pattern: SparsePattern,
  values: Float64Array,
): SymmetricFactorisation {
  invariant(analysis.order === pattern.cols, "factorSymmetric: the pattern is not the one analysed");
  invariant(values.length === pattern.rowIndex.length, "factorSymmetric: a value per entry");
  const exponents = equilibrationExponents(pattern, moduli(values));
  const scale = Float64Array.from(exponents, (e) => 2 ** e);
  const a: SparseMatrix = { ...pattern, values };
  const scaled = scaledValues(a, scale);
  const factor = withWorkspace((workspace) =>
    new SymmetricMultifrontal(analysis, scaled.values, workspace).factor(),
  );
  const inertia = inertiaOf(
    factor,
    ZERO_PIVOT_EPSILONS * Number.EPSILON * (scaled.norm > 0 ? scaled.norm : 1),
  );
  const refinement = new RealRefinement(a, scale);
  let released = false;
  return {
    order: analysis.order,
    nonzeros: factor.nonzeros,
    inertia,
    inertiaReliable: factor.perturbedPivots === 0 && inertia.zero === 0,
    solveInPlace: (b) => {
      invariant(!released, "a released factorisation is asked to solve");
      return refinement.solve(b, (x) => solveWithSymmetricFactor(factor, scale, x));
    },
    release: () => {
      factor.fronts.length = 0;
      factor.store.release();
      released = true;
    },
  };
}

function moduli(values: Float64Array): Float64Array {
  const modulus = new Float64Array(values.length);
  for (let p = 0; p < values.length; p++) {
    modulus[p] = Math.abs(values[p]);
    if (!Number.isFinite(modulus[p])) {
      throw new NumericalError(
        "numerics.not-finite",
        `entry ${p} of the matrix to be factored is ${values[p]}`,
        "Look for a formula or matrix file that gives infinite or undefined values.",
      );
    }
  }
  return modulus;
}

/** S A S in the order of the pattern, and its infinity norm. */
function scaledValues(
  a: SparseMatrix,
  scale: Float64Array,
): { readonly values: Float64Array; readonly norm: number } {
  const values = new Float64Array(a.values.length);
  let norm = 0;
  for (let j = 0; j < a.cols; j++) {
    let sum = 0;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) {
      values[p] = a.values[p] * (scale[a.rowIndex[p]] * scale[j]);
      sum += Math.abs(values[p]);
    }
    norm = Math.max(norm, sum);
  }
  return { values, norm };
}

/** Counts from D; the signs of a 2×2 block follow from its determinant and trace. */
function inertiaOf(factor: SymmetricFactor, tolerance: number): Inertia {
  let negative = 0;
  let zero = 0;
  let positive = 0;
  const count = (eigenvalue: number): void => {
    if (Math.abs(eigenvalue) <= tolerance) zero++;
    else if (eigenvalue < 0) negative++;
    else positive++;
  };
  for (const { pivots, diagonal } of factor.fronts) {
    for (let k = 0; k < pivots; k++) {
      const a = diagonal[2 * k];
      const b = diagonal[2 * k + 1];
      if (b === 0) {
        count(a);
        continue;
      }
      const c = diagonal[2 * k + 2];
      const mean = (a + c) / 2;
      // The eigenvalue of larger modulus first; the other from the determinant, without cancellation.
      const larger = mean + (mean < 0 ? -1 : 1) * Math.hypot((a - c) / 2, b);
      count(larger);
      count((a * c - b * b) / larger);
      k++;
    }
  }
  return { negative, zero, positive };
}
