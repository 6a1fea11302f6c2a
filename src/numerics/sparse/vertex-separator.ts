/**
 * A small set of vertices whose removal splits a connected graph into two parts of similar
 * weight: multilevel, with heavy-edge coarsening, grown starts on the coarsest graph and
 * local improvement of the separator on the way back. Deterministic.
 *
 * Source: Karypis & Kumar, SIAM J. Sci. Comput. 20(1), 1998 (levels and matching);
 * Ashcraft & Liu, SIAM J. Matrix Anal. Appl. 19(2), 1998 (moves of a separator vertex).
 */

import type { Graph } from "./node-graph.js";

const COARSEST = 80;
const STARTS = 8;
/** Largest share of the weight that a part may take. */
const LARGEST_SHARE = 0.6;
export const SEPARATOR = 2;

interface WeightedEdges extends Graph {
  /** Original edges that each edge stands for. */
  readonly edgeWeight: Int32Array;
}

/** The part of each vertex: 0, 1 or `SEPARATOR`; no edge joins part 0 and part 1. */
export function vertexSeparator(graph: Graph): Uint8Array {
  const edgeWeight = new Int32Array(graph.adjacent.length).fill(1);
  return separate({ ...graph, edgeWeight });
}

function separate(graph: WeightedEdges): Uint8Array {
  if (graph.order <= COARSEST) return bestGrown(graph);
  const coarseOf = heavyMatching(graph);
  const coarse = contract(graph, coarseOf);
  if (coarse.order > 0.95 * graph.order) return bestGrown(graph);
  const coarsePart = separate(coarse);
  const part = new Uint8Array(graph.order);
  for (let v = 0; v < graph.order; v++) part[v] = coarsePart[coarseOf[v]];
  refine(graph, part);
  return part;
}

/** Pairs each vertex with the unpaired neighbour of heaviest edge; returns the number of the pair. */
function heavyMatching(graph: WeightedEdges): Int32Array {
  const { order, start, adjacent, weight, edgeWeight } = graph;
  const limit = Math.max(2, (1.5 * totalOf(weight)) / COARSEST);
  const coarseOf = new Int32Array(order).fill(-1);
  let pairs = 0;
  const stride = coprimeStride(order);
  for (let t = 0, v = 0; t < order; t++, v = (v + stride) % order) {
    if (coarseOf[v] >= 0) continue;
    let mate = -1;
    let heaviest = 0;
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (coarseOf[u] >= 0 || weight[u] + weight[v] > limit) continue;
      const lighter = mate >= 0 && edgeWeight[p] === heaviest && weight[u] < weight[mate];
      if (edgeWeight[p] > heaviest || lighter) {
        mate = u;
        heaviest = edgeWeight[p];
      }
    }
    coarseOf[v] = pairs;
    if (mate >= 0) coarseOf[mate] = pairs;
    pairs++;
  }
  return coarseOf;
}

/** A step that visits all numbers below `order` in a scattered sequence. */
function coprimeStride(order: number): number {
  let stride = Math.max(1, Math.floor(order * 0.381966));
  while (greatestDivisor(stride, order) !== 1) stride++;
  return stride;
}

function greatestDivisor(a: number, b: number): number {
  return b === 0 ? a : greatestDivisor(b, a % b);
}

/** The graph whose vertices are the pairs; parallel edges are added up. */
function contract(graph: WeightedEdges, coarseOf: Int32Array): WeightedEdges {
  const { order, start, adjacent, weight, edgeWeight } = graph;
  const coarseWeight: number[] = [];
  const first: number[] = [];
  const second: number[] = [];
  for (let v = 0; v < order; v++) {
    const c = coarseOf[v];
    coarseWeight[c] = (coarseWeight[c] ?? 0) + weight[v];
    if (first[c] === undefined) first[c] = v;
    else second[c] = v;
  }
  const pairs = first.length;
  const coarseStart = new Int32Array(pairs + 1);
  const coarseAdjacent = new Int32Array(adjacent.length);
  const coarseEdge = new Int32Array(adjacent.length);
  const placeOf = new Int32Array(pairs).fill(-1);
  let end = 0;
  const enter = (v: number, c: number, begin: number): void => {
    for (let p = start[v]; p < start[v + 1]; p++) {
      const d = coarseOf[adjacent[p]];
      if (d === c) continue;
      if (placeOf[d] < begin) {
        placeOf[d] = end;
        coarseAdjacent[end++] = d;
      }
      coarseEdge[placeOf[d]] += edgeWeight[p];
    }
  };
  for (let c = 0; c < pairs; c++) {
    const begin = end;
    enter(first[c], c, begin);
    if (second[c] !== undefined) enter(second[c], c, begin);
    coarseStart[c + 1] = end;
  }
  return {
    order: pairs,
    start: coarseStart,
    adjacent: coarseAdjacent.slice(0, end),
    weight: Int32Array.from(coarseWeight),
    edgeWeight: coarseEdge.slice(0, end),
  };
}

/** Grows half of the graph from several vertices, improves each and keeps the best. */
function bestGrown(graph: Graph): Uint8Array {
  let best: Uint8Array = new Uint8Array(graph.order);
  let bestCost = Number.POSITIVE_INFINITY;
  let from = farthest(graph, 0);
  for (let t = 0; t < STARTS; t++) {
    const part = grow(graph, from);
    const cost = refine(graph, part);
    if (cost < bestCost) {
      best = part;
      bestCost = cost;
    }
    from = Math.floor(((t + 0.5) * graph.order) / STARTS);
  }
  return best;
}

function breadthFirst(graph: Graph, from: number): Int32Array {
  const queue = new Int32Array(graph.order);
  const seen = new Uint8Array(graph.order);
  let end = 0;
  queue[end++] = from;
  seen[from] = 1;
  for (let read = 0; read < end; read++) {
    const v = queue[read];
    for (let p = graph.start[v]; p < graph.start[v + 1]; p++) {
      const u = graph.adjacent[p];
      if (seen[u] === 1) continue;
      seen[u] = 1;
      queue[end++] = u;
    }
  }
  return queue.subarray(0, end);
}

function farthest(graph: Graph, from: number): number {
  const first = breadthFirst(graph, from);
  const second = breadthFirst(graph, first[first.length - 1]);
  return second[second.length - 1];
}

/** Part 0 is the nearer half around `from`; the vertices of the other half that touch it separate. */
function grow(graph: Graph, from: number): Uint8Array {
  const { order, start, adjacent, weight } = graph;
  const queue = breadthFirst(graph, from);
  const part = new Uint8Array(order).fill(1);
  const half = totalOf(weight) / 2;
  let grown = 0;
  for (let t = 0; t < queue.length && grown < half; t++) {
    part[queue[t]] = 0;
    grown += weight[queue[t]];
  }
  for (let v = 0; v < order; v++) {
    if (part[v] !== 1) continue;
    for (let p = start[v]; p < start[v + 1]; p++) {
      if (part[adjacent[p]] === 0) {
        part[v] = SEPARATOR;
        break;
      }
    }
  }
  return part;
}

function totalOf(weight: Int32Array): number {
  let total = 0;
  for (const w of weight) total += w;
  return total;
}

/** Repeats passes of separator moves until one brings nothing; returns the cost reached. */
function refine(graph: Graph, part: Uint8Array): number {
  const refinement = new SeparatorRefinement(graph, part);
  let cost = refinement.cost();
  for (let pass = 0; pass < 8; pass++) {
    const next = refinement.pass();
    if (next >= cost) break;
    cost = next;
  }
  return cost;
}

class SeparatorRefinement {
  private readonly graph: Graph;
  private readonly part: Uint8Array;
  private readonly total: number;
  private readonly partWeight: Float64Array = new Float64Array(3);
  /** Weight of the neighbours that a separator vertex would pull in when it moves to part 1 (0) or 0 (1). */
  private readonly pull: readonly Float64Array[];
  private readonly separator: Int32Array;
  private readonly slot: Int32Array;
  private size = 0;
  /** A vertex moves out of the separator once per pass. */
  private readonly locked: Uint8Array;
  private readonly logVertex: number[] = [];
  private readonly logPart: number[] = [];

  constructor(graph: Graph, part: Uint8Array) {
    const n = graph.order;
    this.graph = graph;
    this.part = part;
    this.total = totalOf(graph.weight);
    this.pull = [new Float64Array(n), new Float64Array(n)];
    this.separator = new Int32Array(n);
    this.slot = new Int32Array(n);
    this.locked = new Uint8Array(n);
    for (let v = 0; v < n; v++) this.partWeight[part[v]] += graph.weight[v];
  }

  /** Separator weight, with a heavy charge on parts beyond their share and a light one on imbalance. */
  cost(): number {
    const [zero, one, separator] = this.partWeight;
    const larger = Math.max(zero, one);
    const excess = Math.max(0, larger - LARGEST_SHARE * this.total);
    return separator + 10 * excess + (0.05 * separator * Math.abs(zero - one)) / this.total;
  }

  pass(): number {
    this.collectSeparator();
    this.logVertex.length = 0;
    this.logPart.length = 0;
    let best = this.cost();
    let bestLog = 0;
    let since = 0;
    const patience = 20 + (this.size >> 1);
    while (since < patience) {
      const move = this.bestMove();
      if (move < 0) break;
      this.move(move >> 1, move & 1);
      const cost = this.cost();
      since++;
      if (cost < best) {
        best = cost;
        bestLog = this.logVertex.length;
        since = 0;
      }
    }
    this.rollBack(bestLog);
    return best;
  }

  private collectSeparator(): void {
    this.size = 0;
    this.locked.fill(0);
    for (let v = 0; v < this.graph.order; v++) if (this.part[v] === SEPARATOR) this.enter(v);
  }

  private enter(v: number): void {
    const { start, adjacent, weight } = this.graph;
    this.slot[v] = this.size;
    this.separator[this.size++] = v;
    let zero = 0;
    let one = 0;
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (this.part[u] === 0) zero += weight[u];
      else if (this.part[u] === 1) one += weight[u];
    }
    this.pull[0][v] = zero;
    this.pull[1][v] = one;
  }

  private leave(v: number): void {
    const last = this.separator[--this.size];
    this.separator[this.slot[v]] = last;
    this.slot[last] = this.slot[v];
  }

  /** The admissible move of least growth, as 2·vertex + target part; −1 without any. */
  private bestMove(): number {
    const { weight } = this.graph;
    const [pullZero, pullOne] = this.pull;
    const limit = LARGEST_SHARE * this.total;
    const zeroFull = this.partWeight[0] > this.partWeight[1];
    let best = -1;
    let bestGrowth = Number.POSITIVE_INFINITY;
    for (let t = 0; t < this.size; t++) {
      const v = this.separator[t];
      if (this.locked[v] === 1) continue;
      const w = weight[v];
      const toZero = pullOne[v] - w + (zeroFull ? 0.5 : 0);
      const toOne = pullZero[v] - w + (zeroFull ? 0 : 0.5);
      if (toZero < bestGrowth && (this.partWeight[0] + w <= limit || !zeroFull)) {
        bestGrowth = toZero;
        best = 2 * v;
      }
      if (toOne < bestGrowth && (this.partWeight[1] + w <= limit || zeroFull)) {
        bestGrowth = toOne;
        best = 2 * v + 1;
      }
    }
    return best;
  }

  private set(v: number, to: number): void {
    const w = this.graph.weight[v];
    this.logVertex.push(v);
    this.logPart.push(this.part[v]);
    this.partWeight[this.part[v]] -= w;
    this.partWeight[to] += w;
    this.part[v] = to;
  }

  private move(v: number, target: number): void {
    const { start, adjacent, weight } = this.graph;
    this.leave(v);
    this.locked[v] = 1;
    this.set(v, target);
    const other = 1 - target;
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (this.part[u] === SEPARATOR) {
        this.pull[target][u] += weight[v];
      } else if (this.part[u] === other) {
        this.set(u, SEPARATOR);
        for (let q = start[u]; q < start[u + 1]; q++) {
          if (this.part[adjacent[q]] === SEPARATOR) this.pull[other][adjacent[q]] -= weight[u];
        }
        this.enter(u);
      }
    }
  }

  private rollBack(length: number): void {
    for (let t = this.logVertex.length - 1; t >= length; t--) {
      const v = this.logVertex[t];
      const w = this.graph.weight[v];
      this.partWeight[this.part[v]] -= w;
      this.partWeight[this.logPart[t]] += w;
      this.part[v] = this.logPart[t];
    }
  }
}
