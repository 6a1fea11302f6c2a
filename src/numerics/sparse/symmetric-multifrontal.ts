import type { Workspace } from "../kernels/workspace.js";
import type { SymbolicAnalysis } from "./analysis.js";
import { FactorStore } from "./factor-store.js";
import {
  childrenOf,
  type FrontLayout,
  layOutFront,
  placeAmongDelayed,
  updatePlacesInto,
} from "./front-stack.js";
import type { SymmetricFactor } from "./symmetric-substitution.js";

/** One run over the tree of fronts; updates wait at the bottom of the workspace, the front lies above them. */
export class SymmetricMultifrontal {
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
    workspace.kernel.clear(values, diagonal);
    return { values, diagonal, scratch, ids };
  }

  /** Both triangles, of which the upper one is never looked at. */
  private enterEntries(s: number, layout: FrontLayout, front: number): void {
    const { entryStart, entries, entryPlace } = this.analysis;
    const { doubles } = this.workspace;
    const asPlaced = layout.delayed === 0;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      const place = asPlaced ? entryPlace[t] : placeAmongDelayed(entryPlace[t], layout);
      doubles[front + place] = this.values[entries[t]];
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
