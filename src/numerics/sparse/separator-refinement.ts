/**
 * Local improvement of a vertex separator: a vertex leaves it for one part and pulls in its
 * neighbours in the other part. A pass goes to one part, best vertex first, through worse states
 * as well, and returns to the best state seen; passes alternate.
 *
 * Sources: Fiduccia & Mattheyses, 19th Design Automation Conf., 1982; Ashcraft & Liu, SIAM J.
 * Matrix Anal. Appl. 19(2), 1998 (moves of a separator vertex).
 */

import type { Graph } from "./node-graph.js";
import { VertexHeap } from "./vertex-heap.js";

export const SEPARATOR = 2;
/** Largest share of the weight that a part may take. */
const LARGEST_SHARE = 0.6;
/** Charge on the difference of the parts' weights, as a share of the separator. */
const IMBALANCE = 0.2;
const PASSES = 10;
/** A pass ends after this many moves without a better state, per vertex of the separator and at least. */
const PATIENCE = 2;
const LEAST_PATIENCE = 10;
/**
 * Among equal keys the oldest goes first. The separator then advances as a whole front and
 * straightens; last in, first out left separators of regular meshes slanted, up to 1.3 times the shortest.
 */
const AGE = 1e-9;

/** Improves `part` (0, 1 or `SEPARATOR` for each vertex) in place; returns the cost reached. */
export function refineSeparator(graph: Graph, part: Uint8Array): number {
  return new SeparatorRefinement(graph, part).run();
}

class SeparatorRefinement {
  private readonly graph: Graph;
  private readonly part: Uint8Array;
  private readonly total: number;
  private readonly partWeight: Float64Array = new Float64Array(3);
  private readonly heap: VertexHeap;
  private readonly separator: Int32Array;
  private size = 0;
  /** Vertices in the order of their moves in this pass, and the part each came from. */
  private moved: Int32Array = new Int32Array(64);
  private movedFrom: Uint8Array = new Uint8Array(64);
  private moves = 0;
  private entered = 0;

  constructor(graph: Graph, part: Uint8Array) {
    const n = graph.order;
    this.graph = graph;
    this.part = part;
    this.heap = new VertexHeap(n);
    this.separator = new Int32Array(n);
    for (let v = 0; v < n; v++) {
      this.partWeight[part[v]] += graph.weight[v];
      if (part[v] === SEPARATOR) this.separator[this.size++] = v;
    }
    this.total = this.partWeight[0] + this.partWeight[1] + this.partWeight[2];
  }

  run(): number {
    let cost = this.cost();
    let to = this.partWeight[0] < this.partWeight[1] ? 0 : 1;
    let idle = 0;
    for (let pass = 0; pass < PASSES && idle < 2; pass++) {
      const next = this.pass(to, cost);
      idle = next < cost ? 0 : idle + 1;
      cost = next;
      to = 1 - to;
    }
    return cost;
  }

  /** Separator weight, with a heavy charge on parts beyond their share and a light one on imbalance. */
  private cost(): number {
    const zero = this.partWeight[0];
    const one = this.partWeight[1];
    const separator = this.partWeight[SEPARATOR];
    const excess = Math.max(zero, one) - LARGEST_SHARE * this.total;
    const imbalance = (IMBALANCE * separator * Math.abs(zero - one)) / this.total;
    return separator + imbalance + (excess > 0 ? 10 * excess : 0);
  }

  private pass(to: number, startCost: number): number {
    const { graph, partWeight, heap } = this;
    this.begin(1 - to);
    const limit = LARGEST_SHARE * this.total;
    const patience = PATIENCE * this.size + LEAST_PATIENCE;
    let best = startCost;
    let bestMoves = 0;
    let since = 0;
    while (since < patience) {
      const v = heap.takeLargest();
      if (v < 0) break;
      if (partWeight[to] + graph.weight[v] > limit) continue;
      this.move(v, to);
      const cost = this.cost();
      since++;
      if (cost < best) {
        best = cost;
        bestMoves = this.moves;
        since = 0;
      }
    }
    heap.clear();
    this.rollBack(bestMoves);
    return best;
  }

  private begin(other: number): void {
    this.moves = 0;
    this.entered = 0;
    for (let t = 0; t < this.size; t++) this.enter(this.separator[t], other);
  }

  /** Enters a separator vertex into the heap by what the separator loses when it goes. */
  private enter(v: number, other: number): void {
    const { start, adjacent, weight } = this.graph;
    const { part } = this;
    let pull = 0;
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (part[u] === other) pull += weight[u];
    }
    this.heap.insert(v, weight[v] - pull - AGE * this.entered++);
  }

  private move(v: number, to: number): void {
    const { start, adjacent, weight } = this.graph;
    const { part, heap } = this;
    const other = 1 - to;
    this.set(v, to);
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (part[u] !== other) continue;
      this.set(u, SEPARATOR);
      const w = weight[u];
      for (let q = start[u]; q < start[u + 1]; q++) {
        if (part[adjacent[q]] === SEPARATOR) heap.raise(adjacent[q], w);
      }
      this.enter(u, other);
    }
  }

  private set(v: number, to: number): void {
    const from = this.part[v];
    const w = this.graph.weight[v];
    if (this.moves === this.moved.length) this.growLog();
    this.moved[this.moves] = v;
    this.movedFrom[this.moves++] = from;
    this.partWeight[from] -= w;
    this.partWeight[to] += w;
    this.part[v] = to;
  }

  private growLog(): void {
    const moved = new Int32Array(2 * this.moves);
    const movedFrom = new Uint8Array(2 * this.moves);
    moved.set(this.moved);
    movedFrom.set(this.movedFrom);
    this.moved = moved;
    this.movedFrom = movedFrom;
  }

  /** Undoes all moves but the first `kept`, and lists the separator anew. */
  private rollBack(kept: number): void {
    const { part, partWeight, moved, movedFrom } = this;
    const { weight } = this.graph;
    for (let t = this.moves - 1; t >= kept; t--) {
      const v = moved[t];
      partWeight[part[v]] -= weight[v];
      partWeight[movedFrom[t]] += weight[v];
      part[v] = movedFrom[t];
    }
    let size = 0;
    for (let t = 0; t < this.size; t++) {
      if (part[this.separator[t]] === SEPARATOR) this.separator[size++] = this.separator[t];
    }
    // A vertex enters the separator at most once per pass.
    for (let t = 0; t < kept; t++) {
      if (part[moved[t]] === SEPARATOR) this.separator[size++] = moved[t];
    }
    this.size = size;
  }
}
