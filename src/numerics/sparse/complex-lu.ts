/**
 * Multifrontal LU of sparse complex matrices with symmetric pattern and unsymmetric values:
 * scaled symmetrically, pivoted inside the fronts, solved with iterative refinement.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Liu, SIAM Review 34(1), 1992.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { ComplexMatrix } from "../dense/matrix.js";
import { withWorkspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { ComplexMultifrontal, type ScaledValues } from "./complex-multifrontal.js";
import { ComplexRefinement, type RefinementNorms } from "./complex-refinement.js";
import { type ComplexFactor, solveWithFactor } from "./complex-substitution.js";
import { equilibrationExponents } from "./equilibration.js";
import type { ComplexValues, SparsePattern } from "./sparse-matrix.js";

export type { SolveReport } from "./backward-error.js";

/** In units of ‖A‖∞ of the scaled matrix. */
const NEGLIGIBLE_PIVOT: number = 8 * Number.EPSILON;

/** A = L U, ready to solve. */
export interface ComplexFactorisation {
  readonly order: number;
  /** Stored entries of L and U. */
  readonly nonzeros: number;
  /** Pivots of at most 8 eps·‖A‖∞ of the scaled matrix (those below eps are replaced): with any A is singular to working precision. */
  readonly negligiblePivots: number;
  /** ln |det A|. */
  readonly logAbsDet: number;
  /** Argument of det A in (−π, π] [rad]. */
  readonly phaseDet: number;
  /**
   * B ← A⁻¹ B, refined; B is n×k. With a singular A the result is huge but finite.
   * @throws NumericalError `numerics.singular` when a value is not finite.
   */
  solveInPlace(b: ComplexMatrix): SolveReport;
  /** B ← A⁻ᴴ B (conjugate transpose); otherwise like `solveInPlace`. */
  solveAdjointInPlace(b: ComplexMatrix): SolveReport;
  /** Gives the memory of the factors to the next factorisation; this one cannot solve any more. */
  release(): void;
}

/**
 * @param values - In the order of the pattern that was analysed; kept for refinement, so the
 *   caller must not overwrite it.
 * @throws NumericalError `numerics.not-finite` when a value is not finite.
 */
export function factorComplex(
  analysis: SymbolicAnalysis,
  pattern: SparsePattern,
  values: ComplexValues,
): ComplexFactorisation {
  const entries = pattern.rowIndex.length;
  invariant(analysis.order === pattern.cols, "factorComplex: the pattern is not the one analysed");
  invariant(values.re.length === entries && values.im.length === entries, "factorComplex: a value per entry");
  const exponents = equilibrationExponents(pattern, moduli(values));
  const scale = Float64Array.from(exponents, (e) => 2 ** e);
  const scaled = scaledValues(pattern, values, scale);
  const factor = withWorkspace((workspace) => new ComplexMultifrontal(analysis, scaled, workspace).factor());
  let released = false;
  let known: Determinant | undefined;
  const determinant = (): Determinant => {
    invariant(!released || known !== undefined, "a released factorisation is asked for its determinant");
    known ??= determinantOf(factor, exponents);
    return known;
  };
  const norm = scaled.norms.scaled.plain;
  const refinement = new ComplexRefinement(pattern, values, scale, scaled.norms);
  const solve = (b: ComplexMatrix, adjoint: boolean): SolveReport => {
    invariant(!released, "a released factorisation is asked to solve");
    return refinement.solve(b, adjoint, (x) => solveWithFactor(factor, scale, x, adjoint));
  };
  return {
    order: analysis.order,
    nonzeros: factor.nonzeros,
    negligiblePivots: negligiblePivotsOf(factor, NEGLIGIBLE_PIVOT * (norm > 0 ? norm : 1)),
    get logAbsDet() {
      return determinant().logAbs;
    },
    get phaseDet() {
      return determinant().phase;
    },
    solveInPlace: (b) => solve(b, false),
    solveAdjointInPlace: (b) => solve(b, true),
    release: () => {
      factor.fronts.length = 0;
      factor.re.release();
      factor.im.release();
      released = true;
    },
  };
}

/** Moduli as far as scaling needs them: the larger part of each entry. */
function moduli({ re, im }: ComplexValues): Float64Array {
  const modulus = new Float64Array(re.length);
  for (let p = 0; p < re.length; p++) {
    modulus[p] = Math.max(Math.abs(re[p]), Math.abs(im[p]));
    if (!Number.isFinite(modulus[p])) {
      throw new NumericalError(
        "numerics.not-finite",
        `entry ${p} of the matrix to be factored is ${re[p]} + ${im[p]} i`,
        "Look for a formula or matrix file that gives infinite or undefined values.",
      );
    }
  }
  return modulus;
}

/** D A D with D = diag(scale), and the norms that refinement needs of both matrices. */
function scaledValues(
  { cols, colStart, rowIndex }: SparsePattern,
  values: ComplexValues,
  scale: Float64Array,
): ScaledValues & { readonly norms: RefinementNorms } {
  const re = new Float64Array(rowIndex.length);
  const im = new Float64Array(rowIndex.length);
  const rowSum = new Float64Array(cols);
  const scaledRowSum = new Float64Array(cols);
  let [adjoint, scaledAdjoint, largest] = [0, 0, 0];
  for (let j = 0; j < cols; j++) {
    const own = scale[j];
    let [columnSum, scaledColumnSum] = [0, 0];
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = rowIndex[p];
      const factor = scale[i] * own;
      const x = values.re[p] * factor;
      const y = values.im[p] * factor;
      re[p] = x;
      im[p] = y;
      largest = Math.max(largest, Math.abs(x), Math.abs(y));
      // Of the scaled entry, whose square neither overflows nor vanishes; powers of two divide exactly.
      const scaledModulus = Math.sqrt(x * x + y * y);
      const modulus = scaledModulus / factor;
      columnSum += modulus;
      rowSum[i] += modulus;
      scaledColumnSum += scaledModulus;
      scaledRowSum[i] += scaledModulus;
    }
    adjoint = Math.max(adjoint, columnSum);
    scaledAdjoint = Math.max(scaledAdjoint, scaledColumnSum);
  }
  let [plain, scaledPlain] = [0, 0];
  for (let i = 0; i < cols; i++) {
    plain = Math.max(plain, rowSum[i]);
    scaledPlain = Math.max(scaledPlain, scaledRowSum[i]);
  }
  const norms = { given: { plain, adjoint }, scaled: { plain: scaledPlain, adjoint: scaledAdjoint } };
  return { re, im, largest, norms };
}

function negligiblePivotsOf(factor: ComplexFactor, bound: number): number {
  let count = 0;
  for (const { order, pivots, chunk, at } of factor.fronts) {
    const re = factor.re.array(chunk);
    const im = factor.im.array(chunk);
    for (let p = at; p < at + pivots * (order + 1); p += order + 1) {
      if (re[p] * re[p] + im[p] * im[p] <= bound * bound) count++;
    }
  }
  return count;
}

interface Determinant {
  readonly logAbs: number;
  readonly phase: number;
}

/** det A = det(L U) / det(D)² times the sign of the permutation from pivot rows to pivot columns. */
function determinantOf(factor: ComplexFactor, exponents: Int32Array): Determinant {
  let logAbs = 0;
  let angle = 0;
  const columnOf = new Int32Array(factor.order);
  for (const { order, pivots, rowIds, colIds, chunk, at } of factor.fronts) {
    const re = factor.re.array(chunk);
    const im = factor.im.array(chunk);
    for (let k = 0; k < pivots; k++) {
      const p = at + k * (order + 1);
      logAbs += Math.log(Math.hypot(re[p], im[p]));
      angle += Math.atan2(im[p], re[p]);
      columnOf[rowIds[k]] = colIds[k];
    }
  }
  for (const e of exponents) logAbs -= 2 * e * Math.LN2;
  if (isOdd(columnOf)) angle += Math.PI;
  const turns = Math.ceil((angle - Math.PI) / (2 * Math.PI));
  return { logAbs, phase: angle - 2 * Math.PI * turns };
}

/** Parity of a permutation by its cycles. */
function isOdd(permutation: Int32Array): boolean {
  const seen = new Uint8Array(permutation.length);
  let swaps = 0;
  for (let start = 0; start < permutation.length; start++) {
    for (let i = start; seen[i] === 0; i = permutation[i]) {
      seen[i] = 1;
      if (permutation[i] !== start) swaps++;
    }
  }
  return swaps % 2 === 1;
}
