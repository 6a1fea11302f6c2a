/**
 * Multifrontal LDLᵀ of sparse real symmetric matrices, definite or not, with its inertia: the
 * numbers of negative, zero and positive eigenvalues, by Sylvester's law those of D.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Bunch & Kaufman, Math. Comp. 31(137), 1977.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { DenseMatrix } from "../dense/matrix.js";
import { type Workspace, withWorkspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { equilibrationExponents } from "./equilibration.js";
import { FactorStore } from "./factor-store.js";
import { childrenOf, type FrontLayout, layOutFront, updatePlacesInto } from "./front-stack.js";
import { RealRefinement } from "./real-refinement.js";
import type { SparseMatrix, SparsePattern } from "./sparse-matrix.js";
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

/** One run over the tree of fronts; updates wait at the bottom of the workspace, the front lies above them. */
class SymmetricMultifrontal {
  private readonly analysis: SymbolicAnalysis;
  private readonly values: Float64Array;
  private readonly workspace: Workspace;
  private readonly tiny: number;
  private readonly placeOf: Int32Array;
  /** First byte above the waiting updates. */
  private top: number;
  private readonly factorOut: SymmetricFactor;

  constructor(analysis: SymbolicAnalysis, values: Float64Array, workspace: Workspace) {
    const { order, predictedNonzeros } = analysis;
    this.analysis = analysis;
    this.values = values;
    this.workspace = workspace;
    this.top = workspace.begin;
    let largest = 0;
    for (let p = 0; p < values.length; p++) largest = Math.max(largest, Math.abs(values[p]));
    this.tiny = Number.EPSILON * (largest > 0 ? largest : 1);
    this.placeOf = new Int32Array(order);
    this.factorOut = {
      order,
      fronts: [],
      store: new FactorStore((predictedNonzeros + predictedDiagonalBlocks(analysis)) / 2),
      nonzeros: 0,
      perturbedPivots: 0,
    };
  }

  factor(): SymmetricFactor {
    const { analysis, factorOut, workspace } = this;
    const children = childrenOf(analysis);
    for (let s = 0; s < analysis.fronts; s++) {
      const layout = layOutFront(analysis, s, children[s], factorOut.fronts, this.placeOf);
      const front = this.placeFront(layout);
      this.enterEntries(s, layout, front.values / 8);
      const base = this.addUpdates(layout, children[s], front);
      const pivots = this.eliminate(layout, front, analysis.parent[s] < 0);
      factorOut.perturbedPivots += workspace.kernel.perturbedSymmetricPivots();
      this.keepFactor(layout, front, pivots);
      const size = layout.order - pivots;
      workspace.kernel.packLower(base, front.values + 8 * pivots * (layout.order + 1), layout.order, size);
      this.top = base + 8 * lowerEntries(size);
    }
    return factorOut;
  }

  private placeFront({ own, delayed, order }: FrontLayout): FrontPlace {
    const { workspace } = this;
    const values = this.top;
    const diagonal = values + 8 * order * order;
    const scratch = diagonal + 16 * (own + delayed);
    const ids = scratch + 8 * workspace.kernel.symmetricScratch(order);
    workspace.ensure(ids + 4 * order);
    workspace.doubles.fill(0, values / 8, diagonal / 8);
    return { values, diagonal, scratch, ids };
  }

  private enterEntries(s: number, { own, delayed, order }: FrontLayout, front: number): void {
    const { entryStart, entries, entryRow, entryCol } = this.analysis;
    const { doubles } = this.workspace;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      if (entryRow[t] < entryCol[t]) continue;
      const i = entryRow[t] < own ? entryRow[t] : entryRow[t] + delayed;
      const j = entryCol[t] < own ? entryCol[t] : entryCol[t] + delayed;
      doubles[front + i + j * order] = this.values[entries[t]];
    }
  }

  /** Adds the children's updates, the last of which lies on top; returns where the first begins. */
  private addUpdates({ own, delayed, order }: FrontLayout, children: Int32Array, front: FrontPlace): number {
    const { kernel, integers } = this.workspace;
    let delayedAt = own + delayed;
    let begin = this.top;
    for (let t = children.length - 1; t >= 0; t--) {
      const child = this.factorOut.fronts[children[t]];
      const size = child.order - child.pivots;
      delayedAt -= child.delayed;
      begin -= 8 * lowerEntries(size);
      updatePlacesInto(integers, front.ids / 4, child, delayedAt, this.placeOf);
      // Only a delayed column can stand behind rows that came after it.
      kernel.addLowerUpdate(front.values, order, begin, size, front.ids, front.scratch, child.delayed);
    }
    return begin;
  }

  private eliminate(
    { own, delayed, order, rowIds }: FrontLayout,
    front: FrontPlace,
    isRoot: boolean,
  ): number {
    const { kernel, integers } = this.workspace;
    const { values, ids, diagonal, scratch } = front;
    integers.set(rowIds, ids / 4);
    const summed = own + delayed;
    const root = isRoot ? 1 : 0;
    const pivots = kernel.eliminateSymmetric(values, order, summed, ids, diagonal, scratch, this.tiny, root);
    rowIds.set(integers.subarray(ids / 4, ids / 4 + order));
    return pivots;
  }

  private keepFactor(layout: FrontLayout, front: FrontPlace, pivots: number): void {
    const { own, delayed, order, rowIds } = layout;
    const { store, fronts } = this.factorOut;
    const { doubles } = this.workspace;
    const { chunk, at } = store.reserve(pivots * order);
    store.array(chunk).set(doubles.subarray(front.values / 8, front.values / 8 + pivots * order), at);
    const diagonal = doubles.slice(front.diagonal / 8, front.diagonal / 8 + 2 * pivots);
    this.factorOut.nonzeros += pivots * order - (pivots * (pivots - 1)) / 2;
    fronts.push({
      order,
      pivots,
      delayed: own + delayed - pivots,
      rowIds,
      colIds: rowIds,
      chunk,
      at,
      diagonal,
    });
  }
}

/** Byte addresses of a front in the workspace. */
interface FrontPlace {
  readonly values: number;
  readonly diagonal: number;
  readonly scratch: number;
  readonly ids: number;
}

function lowerEntries(size: number): number {
  return (size * (size + 1)) / 2;
}

/** Sum of the squared pivot counts: what the columns of L hold beyond half of L and U. */
function predictedDiagonalBlocks({ fronts, pivotStart }: SymbolicAnalysis): number {
  let sum = 0;
  for (let s = 0; s < fronts; s++) sum += (pivotStart[s + 1] - pivotStart[s]) ** 2;
  return sum;
}
