/**
 * Multifrontal LU of sparse complex matrices with symmetric pattern and unsymmetric values:
 * scaled symmetrically, pivoted inside the fronts, solved with iterative refinement.
 *
 * Sources: Duff & Reid, ACM TOMS 9(3), 1983; Liu, SIAM Review 34(1), 1992.
 */

import { invariant, NumericalError } from "../../errors.js";
import type { ComplexMatrix } from "../dense/matrix.js";
import { type Workspace, withWorkspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { SolveReport } from "./backward-error.js";
import { ComplexRefinement } from "./complex-refinement.js";
import { type ComplexFactor, solveWithFactor } from "./complex-substitution.js";
import { equilibrationExponents } from "./equilibration.js";
import { FactorStore } from "./factor-store.js";
import { childrenOf, type FrontLayout, layOutFront, updatePlacesInto } from "./front-stack.js";
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
  const refinement = new ComplexRefinement(pattern, values, scale);
  const solve = (b: ComplexMatrix, adjoint: boolean): SolveReport => {
    invariant(!released, "a released factorisation is asked to solve");
    return refinement.solve(b, adjoint, (x) => solveWithFactor(factor, scale, x, adjoint));
  };
  return {
    order: analysis.order,
    nonzeros: factor.nonzeros,
    negligiblePivots: negligiblePivotsOf(factor, NEGLIGIBLE_PIVOT * (scaled.norm > 0 ? scaled.norm : 1)),
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

/** D A D with D = diag(scale), and a bound of its infinity norm. */
function scaledValues(
  pattern: SparsePattern,
  values: ComplexValues,
  scale: Float64Array,
): ComplexValues & { readonly norm: number } {
  const { cols, colStart, rowIndex } = pattern;
  const re = new Float64Array(rowIndex.length);
  const im = new Float64Array(rowIndex.length);
  const rowSum = new Float64Array(cols);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const factor = scale[rowIndex[p]] * scale[j];
      re[p] = values.re[p] * factor;
      im[p] = values.im[p] * factor;
      rowSum[rowIndex[p]] += Math.abs(re[p]) + Math.abs(im[p]);
    }
  }
  return { re, im, norm: rowSum.reduce((most, sum) => Math.max(most, sum), 0) };
}

/** One run over the tree of fronts; updates wait at the bottom of the workspace, the front lies above them. */
class ComplexMultifrontal {
  private readonly analysis: SymbolicAnalysis;
  private readonly values: ComplexValues;
  private readonly workspace: Workspace;
  private readonly tiny: number;
  private readonly placeOf: Int32Array;
  /** First byte above the waiting updates. */
  private top: number;
  private readonly factorOut: ComplexFactor;

  constructor(analysis: SymbolicAnalysis, values: ComplexValues, workspace: Workspace) {
    this.analysis = analysis;
    this.values = values;
    this.workspace = workspace;
    this.top = workspace.begin;
    let largest = 0;
    for (let p = 0; p < values.re.length; p++) {
      largest = Math.max(largest, Math.abs(values.re[p]), Math.abs(values.im[p]));
    }
    this.tiny = Number.EPSILON * (largest > 0 ? largest : 1);
    this.placeOf = new Int32Array(analysis.order);
    this.factorOut = {
      order: analysis.order,
      fronts: [],
      re: new FactorStore(analysis.predictedNonzeros),
      im: new FactorStore(analysis.predictedNonzeros),
      nonzeros: 0,
    };
  }

  factor(): ComplexFactor {
    const { analysis, factorOut } = this;
    const children = childrenOf(analysis);
    for (let s = 0; s < analysis.fronts; s++) {
      const layout = layOutFront(analysis, s, children[s], factorOut.fronts, this.placeOf);
      const front = this.placeFront(layout);
      this.enterEntries(s, layout, front);
      const base = this.addUpdates(layout, children[s], front);
      const pivots = this.eliminate(layout, front, analysis.parent[s] < 0);
      this.keepFactor(layout, front, pivots);
      this.packUpdate(layout.order, front, pivots, base);
    }
    return factorOut;
  }

  private placeFront({ order }: FrontLayout): FrontPlace {
    const entries = 8 * order * order;
    const re = this.top;
    const im = re + entries;
    const rowIds = im + entries;
    const colIds = rowIds + 4 * order;
    this.workspace.ensure(colIds + 4 * order);
    this.workspace.doubles.fill(0, re / 8, rowIds / 8);
    return { re, im, rowIds, colIds };
  }

  private enterEntries(s: number, { own, delayed, order }: FrontLayout, front: FrontPlace): void {
    const { entryStart, entries, entryRow, entryCol } = this.analysis;
    const { re, im } = this.values;
    const { doubles } = this.workspace;
    const toRe = front.re / 8;
    const toIm = front.im / 8;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      const i = entryRow[t] < own ? entryRow[t] : entryRow[t] + delayed;
      const j = entryCol[t] < own ? entryCol[t] : entryCol[t] + delayed;
      doubles[toRe + i + j * order] = re[entries[t]];
      doubles[toIm + i + j * order] = im[entries[t]];
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
      begin -= 16 * size * size;
      // Below the delayed part rows and columns of an update carry the same dofs.
      updatePlacesInto(integers, front.rowIds / 4, child, delayedAt, this.placeOf);
      kernel.addSquareUpdate(front.re, order, begin, size, front.rowIds, front.colIds);
      kernel.addSquareUpdate(front.im, order, begin + 8 * size * size, size, front.rowIds, front.colIds);
    }
    return begin;
  }

  private eliminate(layout: FrontLayout, front: FrontPlace, isRoot: boolean): number {
    const { own, delayed, order, rowIds, colIds } = layout;
    const { kernel, integers } = this.workspace;
    const { re, im } = front;
    integers.set(rowIds, front.rowIds / 4);
    integers.set(colIds, front.colIds / 4);
    const summed = own + delayed;
    const root = isRoot ? 1 : 0;
    const pivots = kernel.eliminateComplex(
      re,
      im,
      order,
      summed,
      front.rowIds,
      front.colIds,
      this.tiny,
      root,
    );
    rowIds.set(integers.subarray(front.rowIds / 4, front.rowIds / 4 + order));
    colIds.set(integers.subarray(front.colIds / 4, front.colIds / 4 + order));
    return pivots;
  }

  /** Stores the pivot columns of L and U₁₁ and the pivot rows of U beyond them. */
  private keepFactor(layout: FrontLayout, front: FrontPlace, pivots: number): void {
    const { own, delayed, order, rowIds, colIds } = layout;
    const { re, im, fronts } = this.factorOut;
    const size = pivots * (2 * order - pivots);
    const { chunk, at } = re.reserve(size);
    im.reserve(size);
    this.copyPivotPart(re.array(chunk), at, front.re, order, pivots);
    this.copyPivotPart(im.array(chunk), at, front.im, order, pivots);
    this.factorOut.nonzeros += size;
    fronts.push({ order, pivots, delayed: own + delayed - pivots, rowIds, colIds, chunk, at });
  }

  /** The first columns of a front, then the first rows of the others. */
  private copyPivotPart(to: Float64Array, at: number, front: number, order: number, pivots: number): void {
    const { kernel, doubles } = this.workspace;
    const columns = pivots * order;
    to.set(doubles.subarray(front / 8, front / 8 + columns), at);
    // What has been copied makes room to gather the rows, as there are no more of them.
    const rows = pivots * (order - pivots);
    kernel.packRows(front, front + 8 * columns, order, pivots, order - pivots);
    to.set(doubles.subarray(front / 8, front / 8 + rows), at + columns);
  }

  /** Moves the update down to `base`, over the children's that it contains. */
  private packUpdate(order: number, front: FrontPlace, pivots: number, base: number): void {
    const { kernel } = this.workspace;
    const size = order - pivots;
    const skipped = 8 * pivots * (order + 1);
    kernel.packSquare(base, front.re + skipped, order, size);
    kernel.packSquare(base + 8 * size * size, front.im + skipped, order, size);
    this.top = base + 16 * size * size;
  }
}

/** Byte addresses of a front in the workspace. */
interface FrontPlace {
  readonly re: number;
  readonly im: number;
  readonly rowIds: number;
  readonly colIds: number;
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
