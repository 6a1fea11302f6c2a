/**
 * What an elimination order costs: the elimination tree and the lengths of the columns of L,
 * found from the edges of the graph without forming L.
 *
 * Sources: Liu, SIAM J. Matrix Anal. Appl. 11(1), 1990 (elimination tree); Gilbert, Ng, Peyton,
 * SIAM J. Matrix Anal. Appl. 15(4), 1994 (column counts).
 */

import type { Graph } from "./node-graph.js";

/** Columns are numbered by elimination, descendants of a column directly before it. */
export interface EliminationTree {
  /** Vertex of each column: the order asked for, or an equivalent one. */
  readonly order: Int32Array;
  /** Column of the first entry below the diagonal of each column of L, −1 for a root. */
  readonly parent: Int32Array;
  /** Dofs in each column of L, its own vertex included. */
  readonly length: Float64Array;
  /** Sum of the squared column lengths over the dofs, to compare orders by. */
  readonly operations: number;
}

/** The children of k are `first[k]`, `next[first[k]]`, … until −1, ascending. */
export interface ChildLists {
  readonly first: Int32Array;
  readonly next: Int32Array;
}

/** Cost O(edges · α) in time, O(vertices) in memory. */
export function eliminationTree(graph: Graph, order: Int32Array): EliminationTree {
  const anyParent = parents(graph, order);
  const sequence = postorder(childLists(anyParent), anyParent);
  const place = new Int32Array(order.length);
  for (let k = 0; k < order.length; k++) place[sequence[k]] = k;
  const postordered = new Int32Array(order.length);
  const parent = new Int32Array(order.length);
  for (let k = 0; k < order.length; k++) {
    const above = anyParent[sequence[k]];
    postordered[k] = order[sequence[k]];
    parent[k] = above < 0 ? -1 : place[above];
  }
  const length = columnLengths(graph, postordered, parent);
  let operations = 0;
  for (let k = 0; k < order.length; k++) operations += graph.weight[postordered[k]] * length[k] * length[k];
  return { order: postordered, parent, length, operations };
}

export function childLists(parent: Int32Array): ChildLists {
  const first = new Int32Array(parent.length).fill(-1);
  const next = new Int32Array(parent.length).fill(-1);
  for (let k = parent.length - 1; k >= 0; k--) {
    if (parent[k] < 0) continue;
    next[k] = first[parent[k]];
    first[parent[k]] = k;
  }
  return { first, next };
}

function positions(order: Int32Array): Int32Array {
  const positionOf = new Int32Array(order.length);
  for (let k = 0; k < order.length; k++) positionOf[order[k]] = k;
  return positionOf;
}

function parents(graph: Graph, order: Int32Array): Int32Array {
  const { start, adjacent } = graph;
  const n = graph.order;
  const positionOf = positions(order);
  const parent = new Int32Array(n).fill(-1);
  const ancestor = new Int32Array(n).fill(-1);
  for (let k = 0; k < n; k++) {
    const v = order[k];
    for (let p = start[v]; p < start[v + 1]; p++) {
      let i = positionOf[adjacent[p]];
      while (i >= 0 && i < k) {
        const next = ancestor[i];
        ancestor[i] = k;
        if (next < 0) parent[i] = k;
        i = next;
      }
    }
  }
  return parent;
}

/** Children directly before their parents, subtree by subtree. */
function postorder({ first, next }: ChildLists, parent: Int32Array): Int32Array {
  const n = parent.length;
  const sequence = new Int32Array(n);
  let done = 0;
  for (let root = 0; root < n; root++) {
    if (parent[root] >= 0) continue;
    let k = root;
    while (first[k] >= 0) k = first[k];
    for (;;) {
      sequence[done++] = k;
      if (k === root) break;
      const sibling = next[k];
      if (sibling < 0) {
        k = parent[k];
        continue;
      }
      k = sibling;
      while (first[k] >= 0) k = first[k];
    }
  }
  return sequence;
}

/**
 * Row i of L is a subtree with root i. Its weight enters at its leaves, leaves again where two
 * leaves meet and above its root; sums over subtrees then give the column lengths.
 */
function columnLengths(graph: Graph, order: Int32Array, parent: Int32Array): Float64Array {
  const { start, adjacent, weight } = graph;
  const n = graph.order;
  const positionOf = positions(order);
  const length = new Float64Array(n);
  const firstDescendant = firstDescendants(parent);
  const lastFirst = new Int32Array(n).fill(-1);
  const lastLeaf = new Int32Array(n).fill(-1);
  const ancestor = new Int32Array(n);
  for (let k = 0; k < n; k++) ancestor[k] = k;
  for (let k = 0; k < n; k++) {
    const v = order[k];
    if (firstDescendant[k] === k) length[k] += weight[v];
    if (parent[k] >= 0) length[parent[k]] -= weight[v];
    for (let p = start[v]; p < start[v + 1]; p++) {
      const u = adjacent[p];
      const i = positionOf[u];
      if (i <= k || firstDescendant[k] <= lastFirst[i]) continue;
      lastFirst[i] = firstDescendant[k];
      length[k] += weight[u];
      if (lastLeaf[i] >= 0) length[meeting(ancestor, lastLeaf[i])] -= weight[u];
      lastLeaf[i] = k;
    }
    if (parent[k] >= 0) ancestor[k] = parent[k];
  }
  for (let k = 0; k < n; k++) if (parent[k] >= 0) length[parent[k]] += length[k];
  return length;
}

/** The least column in the subtree of each column; its own number marks a leaf. */
function firstDescendants(parent: Int32Array): Int32Array {
  const first = new Int32Array(parent.length).fill(-1);
  for (let k = 0; k < parent.length; k++) {
    for (let j = k; j >= 0 && first[j] < 0; j = parent[j]) first[j] = k;
  }
  return first;
}

/** Topmost column reached from `leaf` so far; shortens the path on the way. */
function meeting(ancestor: Int32Array, leaf: number): number {
  let top = leaf;
  while (ancestor[top] !== top) top = ancestor[top];
  let k = leaf;
  while (k !== top) {
    const above = ancestor[k];
    ancestor[k] = top;
    k = above;
  }
  return top;
}
