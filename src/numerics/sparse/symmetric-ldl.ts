/**
 * Multifrontal LDLᵀ of sparse real symmetric matrices, definite or not, with its inertia: the
 * numbers of negative, zero and positive eigenvalues, by Sylvester's law those of D.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Bunch & Kaufman, Math. Comp. 31(137), 1977.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { DenseMatrix } from "../dense/matrix.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { equilibrationExponents } from "./equilibration.js";
import { FactorStore, grown } from "./factor-store.js";
import { childrenOf, type FrontLayout, layOutFront, updatePlacesInto } from "./front-stack.js";
import { RealRefinement } from "./real-refinement.js";
import type { SparseMatrix, SparsePattern } from "./sparse-matrix.js";
import { eliminateSymmetricFront, type SymmetricFront } from "./symmetric-front.js";
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
  const a: SparseMatrix = { ...pattern, values };
  const scaled = scaledValues(a, exponents);
  const factor = new SymmetricMultifrontal(analysis, scaled.values).factor();
  const scale = Float64Array.from(exponents, (e) => 2 ** e);
  const inertia = inertiaOf(
    factor,
    ZERO_PIVOT_EPSILONS * Number.EPSILON * (scaled.norm > 0 ? scaled.norm : 1),
  );
  const refinement = new RealRefinement(a, scale);
  return {
    order: analysis.order,
    nonzeros: factor.nonzeros,
    inertia,
    inertiaReliable: factor.perturbedPivots === 0 && inertia.zero === 0,
    solveInPlace: (b) => refinement.solve(b, (x) => solveWithSymmetricFactor(factor, scale, x)),
  };
}

function moduli(values: Float64Array): Float64Array {
  const bad = values.findIndex((v) => !Number.isFinite(v));
  if (bad >= 0) {
    throw new NumericalError(
      "numerics.not-finite",
      `entry ${bad} of the matrix to be factored is ${values[bad]}`,
      "Look for a formula or matrix file that gives infinite or undefined values.",
    );
  }
  return values.map(Math.abs);
}

/** S A S in the order of the pattern, and its infinity norm. */
function scaledValues(
  a: SparseMatrix,
  exponents: Int32Array,
): { readonly values: Float64Array; readonly norm: number } {
  const values = new Float64Array(a.values.length);
  let norm = 0;
  for (let j = 0; j < a.cols; j++) {
    let sum = 0;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) {
      values[p] = a.values[p] * 2 ** (exponents[a.rowIndex[p]] + exponents[j]);
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

/** One run over the tree of fronts. */
class SymmetricMultifrontal {
  private readonly analysis: SymbolicAnalysis;
  private readonly values: Float64Array;
  private readonly tiny: number;
  private readonly placeOf: Int32Array;
  private places: Int32Array;
  private front: Float64Array;
  private stack: Float64Array;
  private stackTop = 0;
  private readonly factorOut: SymmetricFactor;

  constructor(analysis: SymbolicAnalysis, values: Float64Array) {
    const { largestFront, stackPeak, order, predictedNonzeros } = analysis;
    this.analysis = analysis;
    this.values = values;
    const largest = values.reduce((m, v) => Math.max(m, Math.abs(v)), 0);
    this.tiny = Number.EPSILON * (largest > 0 ? largest : 1);
    this.placeOf = new Int32Array(order);
    this.places = new Int32Array(largestFront);
    this.front = new Float64Array(largestFront * largestFront);
    this.stack = new Float64Array(stackPeak);
    this.factorOut = {
      order,
      fronts: [],
      store: new FactorStore((predictedNonzeros + predictedDiagonalBlocks(analysis)) / 2),
      nonzeros: 0,
      perturbedPivots: 0,
    };
  }

  factor(): SymmetricFactor {
    const { analysis, factorOut } = this;
    const children = childrenOf(analysis);
    for (let s = 0; s < analysis.fronts; s++) {
      const layout = layOutFront(analysis, s, children[s], factorOut.fronts, this.placeOf);
      const front = this.assemble(s, layout, children[s]);
      const isRoot = analysis.parent[s] < 0;
      const { pivots, perturbed, diagonal } = eliminateSymmetricFront(front, { tiny: this.tiny, isRoot });
      factorOut.perturbedPivots += perturbed;
      this.keepFactor(front, pivots, diagonal);
      this.push(front, pivots);
    }
    return factorOut;
  }

  private assemble(s: number, layout: FrontLayout, children: Int32Array): SymmetricFront {
    const { own, delayed, order, rowIds } = layout;
    if (order * order > this.front.length) this.front = new Float64Array(order * order);
    if (order > this.places.length) this.places = new Int32Array(order);
    const { front } = this;
    front.fill(0, 0, order * order);
    const { entryStart, entries, entryRow, entryCol } = this.analysis;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      if (entryRow[t] < entryCol[t]) continue;
      const i = entryRow[t] < own ? entryRow[t] : entryRow[t] + delayed;
      const j = entryCol[t] < own ? entryCol[t] : entryCol[t] + delayed;
      front[i + j * order] = this.values[entries[t]];
    }
    let delayedAt = own + delayed;
    for (let t = children.length - 1; t >= 0; t--) {
      delayedAt -= this.factorOut.fronts[children[t]].delayed;
      this.popInto(order, children[t], delayedAt);
    }
    return { values: front, order, summed: own + delayed, ids: rowIds };
  }

  /** Adds the update of the child on top of the stack, lower triangle to lower triangle. */
  private popInto(order: number, child: number, delayedAt: number): void {
    const { places, front, stack } = this;
    const eliminated = this.factorOut.fronts[child];
    const size = eliminated.order - eliminated.pivots;
    updatePlacesInto(places, eliminated, delayedAt, this.placeOf);
    this.stackTop -= size * size;
    for (let j = 0; j < size; j++) {
      const column = places[j];
      const from = this.stackTop + j * size;
      // Only a delayed column can stand behind rows that came after it.
      const mayCross = j < eliminated.delayed;
      for (let i = j; i < size; i++) {
        const row = places[i];
        const target = mayCross && row < column ? column + row * order : row + column * order;
        front[target] += stack[from + i];
      }
    }
  }

  private keepFactor(front: SymmetricFront, pivots: number, diagonal: Float64Array): void {
    const { values, order, summed, ids } = front;
    const { chunk, at } = this.factorOut.store.reserve(pivots * order);
    this.factorOut.store.array(chunk).set(values.subarray(0, pivots * order), at);
    this.factorOut.nonzeros += pivots * order - (pivots * (pivots - 1)) / 2;
    const delayed = summed - pivots;
    this.factorOut.fronts.push({ order, pivots, delayed, rowIds: ids, colIds: ids, chunk, at, diagonal });
  }

  private push(front: SymmetricFront, pivots: number): void {
    const { values, order } = front;
    const size = order - pivots;
    const end = this.stackTop + size * size;
    if (end > this.stack.length) this.stack = grown(this.stack, this.stackTop, end);
    const { stack } = this;
    for (let j = 0; j < size; j++) {
      const from = pivots + (pivots + j) * order;
      const to = this.stackTop + j * size;
      for (let i = j; i < size; i++) stack[to + i] = values[from + i];
    }
    this.stackTop = end;
  }
}

/** Sum of the squared pivot counts: what the columns of L hold beyond half of L and U. */
function predictedDiagonalBlocks({ fronts, pivotStart }: SymbolicAnalysis): number {
  let sum = 0;
  for (let s = 0; s < fronts; s++) sum += (pivotStart[s + 1] - pivotStart[s]) ** 2;
  return sum;
}
