/**
 * Smaller copies of a graph: vertices joined in pairs along heavy edges.
 *
 * Sources: Karypis & Kumar, SIAM J. Sci. Comput. 20(1), 1998 (heavy-edge matching in the order
 * of degrees); LaSalle et al., IA³ 2015 (pairs two steps apart, for stars).
 */

import type { Random } from "../random.js";
import type { Graph } from "./node-graph.js";

export interface WeightedGraph extends Graph {
  /** Original edges that each edge stands for. */
  readonly edgeWeight: Int32Array;
}

export interface Coarsening {
  readonly coarse: WeightedGraph;
  /** Vertex of the coarse graph that each vertex went into. */
  readonly coarseOf: Int32Array;
}

/** When more than this share stays single, vertices with a common neighbour are paired too. */
const MANY_SINGLE = 0.1;

/** @param heaviest - No pair becomes heavier than this. */
export function coarsen(graph: WeightedGraph, heaviest: number, random: Random): Coarsening {
  const mate = new Int32Array(graph.order).fill(-1);
  const single = pairAlongEdges(graph, heaviest, random, mate);
  if (single > MANY_SINGLE * graph.order) pairTwoSteps(graph, heaviest, mate);
  return contract(graph, mate);
}

/** Pairs each vertex with the free neighbour of heaviest edge; returns the number left single. */
function pairAlongEdges(graph: WeightedGraph, heaviest: number, random: Random, mate: Int32Array): number {
  const { order, start, adjacent, weight, edgeWeight } = graph;
  const sequence = byDegree(graph, random);
  let single = 0;
  for (let t = 0; t < order; t++) {
    const v = sequence[t];
    if (mate[v] >= 0) continue;
    const room = heaviest - weight[v];
    let best = -1;
    let bestEdge = 0;
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      if (edgeWeight[p] > bestEdge && mate[u] < 0 && weight[u] <= room) {
        best = u;
        bestEdge = edgeWeight[p];
      }
    }
    if (best >= 0) {
      mate[v] = best;
      mate[best] = v;
    } else {
      single++;
    }
  }
  return single;
}

/**
 * All vertices, those with few neighbours first because they are the ones that stay single
 * otherwise; in random order among equals and among all of at least 0.7 of the mean degree.
 */
function byDegree({ order, start }: Graph, random: Random): Int32Array {
  const shuffled = new Int32Array(order);
  for (let v = 0; v < order; v++) {
    const t = random.integer(v + 1);
    shuffled[v] = shuffled[t];
    shuffled[t] = v;
  }
  const most = Math.ceil((0.7 * start[order]) / order);
  const next = new Int32Array(most + 2);
  for (let v = 0; v < order; v++) next[Math.min(start[v + 1] - start[v], most) + 1]++;
  for (let d = 0; d <= most; d++) next[d + 1] += next[d];
  const sequence = new Int32Array(order);
  for (const v of shuffled) sequence[next[Math.min(start[v + 1] - start[v], most)]++] = v;
  return sequence;
}

/** Pairs vertices left single when their heaviest edges lead to the same vertex. */
function pairTwoSteps(graph: WeightedGraph, heaviest: number, mate: Int32Array): void {
  const { order, start, adjacent, weight, edgeWeight } = graph;
  const waiting = new Int32Array(order).fill(-1);
  for (let v = 0; v < order; v++) {
    if (mate[v] >= 0) continue;
    let hub = -1;
    let hubEdge = 0;
    for (let p = start[v]; p < start[v + 1]; p++) {
      if (edgeWeight[p] <= hubEdge) continue;
      hub = adjacent[p];
      hubEdge = edgeWeight[p];
    }
    if (hub < 0) continue;
    const other = waiting[hub];
    if (other < 0 || weight[other] + weight[v] > heaviest) {
      waiting[hub] = v;
    } else {
      mate[v] = other;
      mate[other] = v;
      waiting[hub] = -1;
    }
  }
}

/** The graph whose vertices are the pairs and the vertices left single; parallel edges are added up. */
function contract(graph: WeightedGraph, mate: Int32Array): Coarsening {
  const { start, adjacent, weight, edgeWeight } = graph;
  const { coarseOf, first } = pairNumbers(mate);
  const pairs = first.length;
  const coarseWeight = new Int32Array(pairs);
  const coarseStart = new Int32Array(pairs + 1);
  const coarseAdjacent = new Int32Array(adjacent.length);
  const coarseEdge = new Int32Array(adjacent.length);
  const placeOf = new Int32Array(pairs).fill(-1);
  let end = 0;
  for (let c = 0; c < pairs; c++) {
    const begin = end;
    for (let v = first[c], both = 0; v >= 0 && both < 2; v = mate[v], both++) {
      coarseWeight[c] += weight[v];
      for (let p = start[v]; p < start[v + 1]; p++) {
        const d = coarseOf[adjacent[p]];
        if (d === c) continue;
        if (placeOf[d] < begin) {
          placeOf[d] = end;
          coarseAdjacent[end++] = d;
        }
        coarseEdge[placeOf[d]] += edgeWeight[p];
      }
    }
    coarseStart[c + 1] = end;
  }
  const coarse: WeightedGraph = {
    order: pairs,
    start: coarseStart,
    adjacent: coarseAdjacent.slice(0, end),
    weight: coarseWeight,
    edgeWeight: coarseEdge.slice(0, end),
  };
  return { coarse, coarseOf };
}

/** The number of every vertex's pair, and the lower vertex of every pair; in the order of these. */
function pairNumbers(mate: Int32Array): { readonly coarseOf: Int32Array; readonly first: Int32Array } {
  const coarseOf = new Int32Array(mate.length);
  const first = new Int32Array(mate.length);
  let pairs = 0;
  for (let v = 0; v < mate.length; v++) {
    const isUpper = mate[v] >= 0 && mate[v] < v;
    coarseOf[v] = isUpper ? coarseOf[mate[v]] : pairs;
    if (!isUpper) first[pairs++] = v;
  }
  return { coarseOf, first: first.subarray(0, pairs) };
}
