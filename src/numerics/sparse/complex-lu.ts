/**
 * Multifrontal LU of sparse complex matrices with symmetric pattern and unsymmetric values:
 * scaled symmetrically, pivoted inside the fronts, solved with iterative refinement.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Liu, SIAM Review 34(1), 1992.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { ComplexMatrix } from "../dense/matrix.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { type ComplexFront, eliminateComplexFront } from "./complex-front.js";
import { ComplexRefinement } from "./complex-refinement.js";
import { type ComplexFactor, solveWithFactor } from "./complex-substitution.js";
import { equilibrationExponents } from "./equilibration.js";
import { FactorStore, grown } from "./factor-store.js";
import { childrenOf, type FrontLayout, layOutFront, updatePlacesInto } from "./front-stack.js";
import type { ComplexValues, SparsePattern } from "./sparse-matrix.js";

export type { SolveReport } from "./backward-error.js";

/** A = L U, ready to solve. */
export interface ComplexFactorisation {
  readonly order: number;
  /** Stored entries of L and U. */
  readonly nonzeros: number;
  /** Pivots that were negligible and were replaced by eps·‖A‖ (of the scaled matrix): A is singular to working precision. */
  readonly perturbedPivots: number;
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
  const factor = new ComplexMultifrontal(analysis, scaledValues(pattern, values, exponents)).factor();
  const scale = Float64Array.from(exponents, (e) => 2 ** e);
  const determinant = determinantOf(factor, exponents);
  const refinement = new ComplexRefinement(pattern, values, scale);
  const solve = (b: ComplexMatrix, adjoint: boolean): SolveReport =>
    refinement.solve(b, adjoint, (x) => solveWithFactor(factor, scale, x, adjoint));
  return {
    order: analysis.order,
    nonzeros: factor.nonzeros,
    perturbedPivots: factor.perturbedPivots,
    logAbsDet: determinant.logAbs,
    phaseDet: determinant.phase,
    solveInPlace: (b) => solve(b, false),
    solveAdjointInPlace: (b) => solve(b, true),
  };
}

function moduli({ re, im }: ComplexValues): Float64Array {
  const modulus = new Float64Array(re.length);
  for (let p = 0; p < re.length; p++) {
    modulus[p] = Math.hypot(re[p], im[p]);
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

function scaledValues(pattern: SparsePattern, values: ComplexValues, exponents: Int32Array): ComplexValues {
  const { cols, colStart, rowIndex } = pattern;
  const re = new Float64Array(rowIndex.length);
  const im = new Float64Array(rowIndex.length);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const factor = 2 ** (exponents[rowIndex[p]] + exponents[j]);
      re[p] = values.re[p] * factor;
      im[p] = values.im[p] * factor;
    }
  }
  return { re, im };
}

/** One run over the tree of fronts. */
class ComplexMultifrontal {
  private readonly analysis: SymbolicAnalysis;
  private readonly values: ComplexValues;
  private readonly tiny: number;
  private readonly placeOf: Int32Array;
  private rowPlaces: Int32Array;
  private colPlaces: Int32Array;
  private frontRe: Float64Array;
  private frontIm: Float64Array;
  private stackRe: Float64Array;
  private stackIm: Float64Array;
  private stackTop = 0;
  private readonly factorOut: ComplexFactor;

  constructor(analysis: SymbolicAnalysis, values: ComplexValues) {
    const { largestFront, stackPeak, predictedNonzeros } = analysis;
    this.analysis = analysis;
    this.values = values;
    let largest = 0;
    for (let p = 0; p < values.re.length; p++) {
      largest = Math.max(largest, Math.abs(values.re[p]), Math.abs(values.im[p]));
    }
    this.tiny = Number.EPSILON * (largest > 0 ? largest : 1);
    this.placeOf = new Int32Array(analysis.order);
    this.rowPlaces = new Int32Array(largestFront);
    this.colPlaces = new Int32Array(largestFront);
    this.frontRe = new Float64Array(largestFront * largestFront);
    this.frontIm = new Float64Array(largestFront * largestFront);
    this.stackRe = new Float64Array(stackPeak);
    this.stackIm = new Float64Array(stackPeak);
    this.factorOut = {
      order: analysis.order,
      fronts: [],
      re: new FactorStore(predictedNonzeros),
      im: new FactorStore(predictedNonzeros),
      nonzeros: 0,
      perturbedPivots: 0,
    };
  }

  factor(): ComplexFactor {
    const { analysis, factorOut } = this;
    const children = childrenOf(analysis);
    for (let s = 0; s < analysis.fronts; s++) {
      const layout = layOutFront(analysis, s, children[s], factorOut.fronts, this.placeOf);
      const front = this.assemble(s, layout, children[s]);
      const isRoot = analysis.parent[s] < 0;
      const { pivots, perturbed } = eliminateComplexFront(front, { tiny: this.tiny, isRoot });
      factorOut.perturbedPivots += perturbed;
      this.keepFactor(front, pivots);
      this.push(front, pivots);
    }
    return factorOut;
  }

  private assemble(s: number, layout: FrontLayout, children: Int32Array): ComplexFront {
    const { own, delayed, order, rowIds, colIds } = layout;
    this.makeRoom(order);
    const re = this.frontRe;
    const im = this.frontIm;
    re.fill(0, 0, order * order);
    im.fill(0, 0, order * order);
    const { entryStart, entries, entryRow, entryCol } = this.analysis;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      const i = entryRow[t] < own ? entryRow[t] : entryRow[t] + delayed;
      const j = entryCol[t] < own ? entryCol[t] : entryCol[t] + delayed;
      re[i + j * order] = this.values.re[entries[t]];
      im[i + j * order] = this.values.im[entries[t]];
    }
    let delayedAt = own + delayed;
    for (let t = children.length - 1; t >= 0; t--) {
      delayedAt -= this.factorOut.fronts[children[t]].delayed;
      this.popInto(order, children[t], delayedAt);
    }
    return { re, im, order, summed: own + delayed, rowIds, colIds };
  }

  private makeRoom(order: number): void {
    if (order * order > this.frontRe.length) {
      this.frontRe = new Float64Array(order * order);
      this.frontIm = new Float64Array(order * order);
    }
    if (order > this.rowPlaces.length) {
      this.rowPlaces = new Int32Array(order);
      this.colPlaces = new Int32Array(order);
    }
  }

  /** Adds the update of the child on top of the stack. */
  private popInto(order: number, child: number, delayedAt: number): void {
    const { rowPlaces, colPlaces, frontRe, frontIm, stackRe, stackIm } = this;
    const eliminated = this.factorOut.fronts[child];
    const size = eliminated.order - eliminated.pivots;
    updatePlacesInto(rowPlaces, eliminated, delayedAt, this.placeOf);
    // Below the delayed part rows and columns of an update carry the same dofs.
    colPlaces.set(rowPlaces.subarray(0, size));
    this.stackTop -= size * size;
    let q = this.stackTop;
    for (let j = 0; j < size; j++) {
      const column = colPlaces[j] * order;
      for (let i = 0; i < size; i++, q++) {
        frontRe[column + rowPlaces[i]] += stackRe[q];
        frontIm[column + rowPlaces[i]] += stackIm[q];
      }
    }
  }

  /** Stores the pivot columns of L and U₁₁ and the pivot rows of U beyond them. */
  private keepFactor(front: ComplexFront, pivots: number): void {
    const { re, im, order, summed, rowIds, colIds } = front;
    const size = pivots * (2 * order - pivots);
    const { chunk, at } = this.factorOut.re.reserve(size);
    this.factorOut.im.reserve(size);
    const outRe = this.factorOut.re.array(chunk);
    const outIm = this.factorOut.im.array(chunk);
    outRe.set(re.subarray(0, pivots * order), at);
    outIm.set(im.subarray(0, pivots * order), at);
    let q = at + pivots * order;
    for (let j = pivots; j < order; j++) {
      for (let p = j * order; p < j * order + pivots; p++, q++) {
        outRe[q] = re[p];
        outIm[q] = im[p];
      }
    }
    this.factorOut.nonzeros += size;
    this.factorOut.fronts.push({ order, pivots, delayed: summed - pivots, rowIds, colIds, chunk, at });
  }

  private push(front: ComplexFront, pivots: number): void {
    const { re, im, order } = front;
    const size = order - pivots;
    const end = this.stackTop + size * size;
    if (end > this.stackRe.length) {
      this.stackRe = grown(this.stackRe, this.stackTop, end);
      this.stackIm = grown(this.stackIm, this.stackTop, end);
    }
    const { stackRe, stackIm } = this;
    let q = this.stackTop;
    for (let j = pivots; j < order; j++) {
      for (let p = pivots + j * order; p < (j + 1) * order; p++, q++) {
        stackRe[q] = re[p];
        stackIm[q] = im[p];
      }
    }
    this.stackTop = end;
  }
}

/** det A = det(L U) / det(D)² times the sign of the permutation from pivot rows to pivot columns. */
function determinantOf(
  factor: ComplexFactor,
  exponents: Int32Array,
): { readonly logAbs: number; readonly phase: number } {
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
