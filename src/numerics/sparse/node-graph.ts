/**
 * The graph of a structurally symmetric pattern, with dofs that behave alike joined into one
 * weighted vertex: the ordering then works on mechanical nodes and is several times cheaper.
 */

import type { SparsePattern } from "./sparse-matrix.js";

/** Undirected graph without loops; the neighbours of v are `adjacent[start[v] … start[v + 1])`. */
export interface Graph {
  readonly order: number;
  readonly start: Int32Array;
  readonly adjacent: Int32Array;
  /** Dofs that each vertex stands for. */
  readonly weight: Int32Array;
}

/** A graph of nodes and the node of every dof. */
export interface NodeGraph {
  readonly graph: Graph;
  readonly nodeOf: Int32Array;
}

/**
 * Joins dofs with the same group number, or, without groups, dofs whose columns have the same
 * positions (including their own diagonals).
 *
 * @param groups - Group number of each dof, any integers.
 */
export function nodeGraph(pattern: SparsePattern, groups?: Int32Array): NodeGraph {
  const nodeOf = groups === undefined ? indistinguishable(pattern) : consecutive(groups);
  return { nodeOf, graph: quotient(pattern, nodeOf) };
}

function consecutive(groups: Int32Array): Int32Array {
  const numberOf = new Map<number, number>();
  return groups.map((group) => {
    const known = numberOf.get(group);
    if (known !== undefined) return known;
    numberOf.set(group, numberOf.size);
    return numberOf.size - 1;
  });
}

function indistinguishable(pattern: SparsePattern): Int32Array {
  const { cols, colStart, rowIndex } = pattern;
  const nodeOf = new Int32Array(cols);
  const hashOf = new Int32Array(cols);
  // Chains of columns that were first of their kind, by the low bits of their hashes.
  const buckets = 2 ** Math.ceil(Math.log2(cols + 1));
  const first = new Int32Array(buckets).fill(-1);
  const next = new Int32Array(cols).fill(-1);
  let nodes = 0;
  for (let j = 0; j < cols; j++) {
    let hash = colStart[j + 1] - colStart[j];
    for (let p = colStart[j]; p < colStart[j + 1]; p++) hash = (Math.imul(hash, 31) + rowIndex[p]) | 0;
    hash ^= hash >>> 15;
    hashOf[j] = hash;
    const bucket = hash & (buckets - 1);
    let twin = first[bucket];
    while (twin >= 0 && (hashOf[twin] !== hash || !sameColumn(pattern, twin, j))) twin = next[twin];
    if (twin >= 0) {
      nodeOf[j] = nodeOf[twin];
    } else {
      nodeOf[j] = nodes++;
      next[j] = first[bucket];
      first[bucket] = j;
    }
  }
  return nodeOf;
}

function sameColumn({ colStart, rowIndex }: SparsePattern, i: number, j: number): boolean {
  const length = colStart[i + 1] - colStart[i];
  if (colStart[j + 1] - colStart[j] !== length) return false;
  for (let t = 0; t < length; t++) {
    if (rowIndex[colStart[i] + t] !== rowIndex[colStart[j] + t]) return false;
  }
  return true;
}

function quotient(pattern: SparsePattern, nodeOf: Int32Array): Graph {
  const { cols, colStart, rowIndex } = pattern;
  let order = 0;
  for (let j = 0; j < cols; j++) order = Math.max(order, nodeOf[j] + 1);
  const weight = new Int32Array(order);
  for (let j = 0; j < cols; j++) weight[nodeOf[j]]++;
  const { memberStart, members } = membersByNode(nodeOf, weight);

  const start = new Int32Array(order + 1);
  const adjacent = new Int32Array(rowIndex.length);
  const seen = new Int32Array(order).fill(-1);
  let end = 0;
  for (let v = 0; v < order; v++) {
    seen[v] = v;
    for (let t = memberStart[v]; t < memberStart[v + 1]; t++) {
      const j = members[t];
      for (let p = colStart[j]; p < colStart[j + 1]; p++) {
        const u = nodeOf[rowIndex[p]];
        if (seen[u] === v) continue;
        seen[u] = v;
        adjacent[end++] = u;
      }
    }
    start[v + 1] = end;
  }
  return { order, start, adjacent: adjacent.slice(0, end), weight };
}

/**
 * The graph of some vertices and the edges among them.
 *
 * @param numberOf - Scratch of the order of `graph`, all −1 before and after.
 */
export function inducedGraph(graph: Graph, vertices: Int32Array, numberOf: Int32Array): Graph {
  const { start, adjacent, weight } = graph;
  const order = vertices.length;
  let edges = 0;
  for (let t = 0; t < order; t++) {
    numberOf[vertices[t]] = t;
    edges += start[vertices[t] + 1] - start[vertices[t]];
  }
  const subStart = new Int32Array(order + 1);
  const subAdjacent = new Int32Array(edges);
  const subWeight = new Int32Array(order);
  let end = 0;
  for (let t = 0; t < order; t++) {
    const v = vertices[t];
    subWeight[t] = weight[v];
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = numberOf[adjacent[p]];
      if (u >= 0) subAdjacent[end++] = u;
    }
    subStart[t + 1] = end;
  }
  for (let t = 0; t < order; t++) numberOf[vertices[t]] = -1;
  return { order, start: subStart, adjacent: subAdjacent.slice(0, end), weight: subWeight };
}

/** The dofs of each node, ascending. */
export function membersByNode(
  nodeOf: Int32Array,
  weight: Int32Array,
): { readonly memberStart: Int32Array; readonly members: Int32Array } {
  const memberStart = new Int32Array(weight.length + 1);
  for (let v = 0; v < weight.length; v++) memberStart[v + 1] = memberStart[v] + weight[v];
  const next = memberStart.slice(0, weight.length);
  const members = new Int32Array(nodeOf.length);
  for (let j = 0; j < nodeOf.length; j++) members[next[nodeOf[j]]++] = j;
  return { memberStart, members };
}
