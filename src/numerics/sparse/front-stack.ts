/**
 * Bookkeeping shared by the multifrontal factorisations: who waits on the stack, how many
 * columns come delayed, and where the dofs of an update stand in the front that receives it.
 */

import type { SymbolicAnalysis } from "./analysis.js";

/** An eliminated front; ids of its rows and columns are in elimination order, pivots first. */
export interface EliminatedFront {
  /** Rows (and columns) of the front. */
  readonly order: number;
  readonly pivots: number;
  /** Fully summed rows left to the parent. */
  readonly delayed: number;
  readonly rowIds: Int32Array;
  readonly colIds: Int32Array;
}

/** Where a front's own dofs, delayed dofs and dofs below stand: [own | delayed | below]. */
export interface FrontLayout {
  readonly own: number;
  readonly delayed: number;
  readonly order: number;
  readonly rowIds: Int32Array;
  readonly colIds: Int32Array;
}

/** The children of every front, ascending. */
export function childrenOf({ fronts, parent }: SymbolicAnalysis): Int32Array[] {
  const lists: number[][] = Array.from({ length: fronts }, () => []);
  for (let s = 0; s < fronts; s++) if (parent[s] >= 0) lists[parent[s]].push(s);
  return lists.map((list) => Int32Array.from(list));
}

/**
 * Lays out front s and enters its dofs into `placeOf`.
 *
 * @param eliminated - The fronts eliminated so far.
 */
export function layOutFront(
  analysis: SymbolicAnalysis,
  s: number,
  children: Int32Array,
  eliminated: readonly EliminatedFront[],
  placeOf: Int32Array,
): FrontLayout {
  const { pivotStart, pivots, belowStart, below } = analysis;
  const own = pivotStart[s + 1] - pivotStart[s];
  let delayed = 0;
  for (const c of children) delayed += eliminated[c].delayed;
  const order = own + delayed + belowStart[s + 1] - belowStart[s];
  const rowIds = new Int32Array(order);
  for (let t = 0; t < own; t++) rowIds[t] = pivots[pivotStart[s] + t];
  for (let t = 0; t < own; t++) placeOf[rowIds[t]] = t;
  for (let t = own + delayed; t < order; t++) {
    rowIds[t] = below[belowStart[s] + t - own - delayed];
    placeOf[rowIds[t]] = t;
  }
  const colIds = rowIds.slice();
  let place = own;
  for (const c of children) {
    const child = eliminated[c];
    for (let t = child.pivots; t < child.pivots + child.delayed; t++, place++) {
      rowIds[place] = child.rowIds[t];
      colIds[place] = child.colIds[t];
    }
  }
  return { own, delayed, order, rowIds, colIds };
}

/**
 * Places, in the receiving front, of the rows of a child's update: its delayed rows from
 * `delayedAt` on, then the others by their dofs; they are written from `at` on.
 */
export function updatePlacesInto(
  places: Int32Array,
  at: number,
  child: EliminatedFront,
  delayedAt: number,
  placeOf: Int32Array,
): void {
  const { pivots, delayed, order, rowIds } = child;
  for (let t = 0; t < delayed; t++) places[at + t] = delayedAt + t;
  for (let t = pivots + delayed; t < order; t++) places[at + t - pivots] = placeOf[rowIds[t]];
}

/** Where an entry stands that the analysis, which knows of no delayed rows, has put at this place. */
export function placeAmongDelayed(place: number, { own, delayed, order }: FrontLayout): number {
  const told = order - delayed;
  const row = place % told;
  const column = (place - row) / told;
  return (row < own ? row : row + delayed) + (column < own ? column : column + delayed) * order;
}

/** Right-hand sides that a substitution takes through the tree together: fewer where their rows would fill the memory. */
export function columnsTogether(order: number): number {
  return Math.max(4, Math.min(48, Math.floor(2 ** 24 / order)));
}
