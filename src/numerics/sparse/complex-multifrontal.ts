import type { Workspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import type { ComplexFactor } from "./complex-substitution.js";
import { FactorStore } from "./factor-store.js";
import {
  childrenOf,
  type FrontLayout,
  layOutFront,
  placeAmongDelayed,
  updatePlacesInto,
} from "./front-stack.js";
import type { ComplexValues } from "./sparse-matrix.js";

/** The values of an equilibrated matrix, and the largest real or imaginary part. */
export interface ScaledValues extends ComplexValues {
  readonly largest: number;
}

/** One run over the tree of fronts; updates wait at the bottom of the workspace, the front lies above them. */
export class ComplexMultifrontal {
  private readonly analysis: SymbolicAnalysis;
  private readonly values: ScaledValues;
  private readonly workspace: Workspace;
  private readonly tiny: number;
  private readonly placeOf: Int32Array;
  /** First byte above the waiting updates. */
  private top: number;
  private readonly factorOut: ComplexFactor;

  constructor(analysis: SymbolicAnalysis, values: ScaledValues, workspace: Workspace) {
    this.analysis = analysis;
    this.values = values;
    this.workspace = workspace;
    this.top = workspace.begin;
    this.tiny = Number.EPSILON * (values.largest > 0 ? values.largest : 1);
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
    this.workspace.kernel.clear(re, rowIds);
    return { re, im, rowIds, colIds };
  }

  private enterEntries(s: number, layout: FrontLayout, front: FrontPlace): void {
    const { entryStart, entries, entryPlace } = this.analysis;
    const { re, im } = this.values;
    const { doubles } = this.workspace;
    const toRe = front.re / 8;
    const toIm = front.im / 8;
    const asPlaced = layout.delayed === 0;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      const place = asPlaced ? entryPlace[t] : placeAmongDelayed(entryPlace[t], layout);
      doubles[toRe + place] = re[entries[t]];
      doubles[toIm + place] = im[entries[t]];
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
