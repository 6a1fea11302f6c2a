/**
 * A small set of vertices whose removal splits a connected graph into two parts of similar
 * weight: multilevel, with several grown starts on the coarsest graph and local improvement
 * of the separator on the way back.
 *
 * Source: Karypis & Kumar, SIAM J. Sci. Comput. 20(1), 1998.
 */

import type { Random } from "../random.js";
import { coarsen, type WeightedGraph } from "./graph-coarsening.js";
import type { Graph } from "./node-graph.js";
import { refineSeparator, SEPARATOR } from "./separator-refinement.js";

/** Coarsening ends at this order, or when it hardly makes progress. */
const COARSEST = 80;
const LEAST_PROGRESS = 0.95;
/** Starts on the coarsest graph. */
const STARTS = 4;

interface Separation {
  readonly part: Uint8Array;
  readonly cost: number;
}

/** The part of each vertex: 0, 1 or `SEPARATOR`; no edge joins part 0 and part 1. */
export function vertexSeparator(graph: Graph, random: Random): Uint8Array {
  const edgeWeight = new Int32Array(graph.adjacent.length).fill(1);
  return separate({ ...graph, edgeWeight }, random).part;
}

function separate(graph: WeightedGraph, random: Random): Separation {
  if (graph.order <= COARSEST) return bestGrown(graph, random);
  const heaviest = (1.5 * totalOf(graph.weight)) / COARSEST;
  const { coarse, coarseOf } = coarsen(graph, heaviest, random);
  if (coarse.order > LEAST_PROGRESS * graph.order) return bestGrown(graph, random);
  const coarsePart = separate(coarse, random).part;
  const part = new Uint8Array(graph.order);
  for (let v = 0; v < graph.order; v++) part[v] = coarsePart[coarseOf[v]];
  return { part, cost: refineSeparator(graph, part) };
}

function bestGrown(graph: Graph, random: Random): Separation {
  let best = grown(graph, random);
  for (let t = 1; t < STARTS; t++) {
    const next = grown(graph, random);
    if (next.cost < best.cost) best = next;
  }
  return best;
}

/** Part 0 is the nearer half around a random vertex; what touches the other half separates. */
function grown(graph: Graph, random: Random): Separation {
  const { order, start, adjacent, weight } = graph;
  const part = new Uint8Array(order).fill(1);
  const half = totalOf(weight) / 2;
  let weightGrown = 0;
  for (const v of breadthFirst(graph, random.integer(order))) {
    if (weightGrown >= half) break;
    part[v] = 0;
    weightGrown += weight[v];
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
  return { part, cost: refineSeparator(graph, part) };
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

function totalOf(weight: Int32Array): number {
  let total = 0;
  for (const w of weight) total += w;
  return total;
}
