/**
 * From an elimination order to the tree of dense fronts: elimination tree, column counts,
 * and supernodes, joined with their parents where few stored zeros result.
 *
 * Sources: Liu, SIAM J. Matrix Anal. Appl. 11(1), 1990 (elimination tree, postorder for
 * least stack); Ashcraft & Grimes, ACM TOMS 15(4), 1989 (relaxed supernodes).
 */

import type { Graph } from "./node-graph.js";

/** The supernodes in the order of their elimination, children before parents. */
export interface SupernodeTree {
  readonly count: number;
  /** Parent of each supernode, −1 for a root. */
  readonly parent: Int32Array;
  /** The vertices of supernode s, in elimination order, are `vertices[vertexStart[s] … vertexStart[s + 1])`. */
  readonly vertexStart: Int32Array;
  readonly vertices: Int32Array;
  /** Sum of the squared column lengths of L, to compare orders by. */
  readonly operations: number;
}

/** @param order - The vertices of the graph in the order of their elimination. */
export function supernodeTree(graph: Graph, order: Int32Array): SupernodeTree {
  const positionOf = new Int32Array(graph.order);
  for (let k = 0; k < order.length; k++) positionOf[order[k]] = k;
  const parent = eliminationTree(graph, order, positionOf);
  const count = columnWeights(graph, order, positionOf, parent);
  return new Amalgamation(graph, order, parent, count).tree();
}

/** Parent of every column: the row of its first entry below the diagonal of L. */
function eliminationTree(graph: Graph, order: Int32Array, positionOf: Int32Array): Int32Array {
  const n = graph.order;
  const parent = new Int32Array(n).fill(-1);
  const ancestor = new Int32Array(n).fill(-1);
  for (let k = 0; k < n; k++) {
    const v = order[k];
    for (let p = graph.start[v]; p < graph.start[v + 1]; p++) {
      let i = positionOf[graph.adjacent[p]];
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

/** Dofs in every column of L, by walking the row subtrees; O(vertices in L). */
function columnWeights(
  graph: Graph,
  order: Int32Array,
  positionOf: Int32Array,
  parent: Int32Array,
): Float64Array {
  const n = graph.order;
  const count = new Float64Array(n);
  const reached = new Int32Array(n).fill(-1);
  for (let k = 0; k < n; k++) {
    const v = order[k];
    const w = graph.weight[v];
    reached[k] = k;
    count[k] += w;
    for (let p = graph.start[v]; p < graph.start[v + 1]; p++) {
      let i = positionOf[graph.adjacent[p]];
      while (i < k && reached[i] !== k) {
        reached[i] = k;
        count[i] += w;
        i = parent[i];
      }
    }
  }
  return count;
}

/** Entries of a column block: p columns in a front of order f, lower trapezoid. */
function trapezoid(p: number, f: number): number {
  return p * f - (p * (p - 1)) / 2;
}

/** Share of stored zeros that a supernode with p columns may carry. */
function allowedZeros(p: number): number {
  if (p <= 16) return 0.5;
  if (p <= 48) return 0.15;
  return 0.05;
}

class Amalgamation {
  private readonly order: Int32Array;
  private readonly n: number;
  private readonly parent: Int32Array;
  /** Dofs eliminated in the supernode that column k heads, its front, and the zeros it stores. */
  private readonly pivots: Float64Array;
  private readonly front: Float64Array;
  private readonly zeros: Float64Array;
  /** Column that took column k over, or k. */
  private readonly host: Int32Array;
  private readonly operations: number;

  constructor(graph: Graph, order: Int32Array, parent: Int32Array, count: Float64Array) {
    this.order = order;
    this.n = graph.order;
    this.parent = parent;
    this.front = Float64Array.from(count);
    this.pivots = Float64Array.from(order, (v) => graph.weight[v]);
    this.zeros = new Float64Array(this.n);
    this.host = Int32Array.from(order, (_, k) => k);
    this.operations = count.reduce((sum, length, k) => sum + graph.weight[order[k]] * length * length, 0);
  }

  tree(): SupernodeTree {
    const children = childLists(this.parent);
    for (let k = 0; k < this.n; k++) {
      // Children with the largest remainder first: they share most with the parent.
      const remainder = (c: number) => this.front[c] - this.pivots[c];
      const candidates = children[k].sort((a, b) => remainder(b) - remainder(a));
      for (const c of candidates) this.tryToJoin(c, k);
    }
    return this.postordered();
  }

  private tryToJoin(child: number, host: number): void {
    const p = this.pivots[child] + this.pivots[host];
    const f = this.pivots[child] + this.front[host];
    const stored = trapezoid(p, f);
    const used =
      trapezoid(this.pivots[child], this.front[child]) -
      this.zeros[child] +
      trapezoid(this.pivots[host], this.front[host]) -
      this.zeros[host];
    const zeros = stored - used;
    if (zeros > allowedZeros(p) * stored) return;
    this.pivots[host] = p;
    this.front[host] = f;
    this.zeros[host] = zeros;
    this.host[child] = host;
  }

  private postordered(): SupernodeTree {
    const { n, parent } = this;
    const hostOf = new Int32Array(n);
    const members: number[][] = Array.from({ length: n }, () => []);
    for (let k = n - 1; k >= 0; k--) hostOf[k] = this.host[k] === k ? k : hostOf[this.host[k]];
    for (let k = 0; k < n; k++) members[hostOf[k]].push(this.order[k]);
    const above = new Int32Array(n).fill(-1);
    for (let k = 0; k < n; k++) if (hostOf[k] === k && parent[k] >= 0) above[k] = hostOf[parent[k]];
    const sequence = this.leastStackPostorder(hostOf, above);

    const count = sequence.length;
    const numberOf = new Int32Array(n).fill(-1);
    sequence.forEach((k, s) => {
      numberOf[k] = s;
    });
    const vertexStart = new Int32Array(count + 1);
    const vertices = new Int32Array(n);
    const treeParent = new Int32Array(count).fill(-1);
    for (let s = 0; s < count; s++) {
      const k = sequence[s];
      vertices.set(members[k], vertexStart[s]);
      vertexStart[s + 1] = vertexStart[s] + members[k].length;
      if (above[k] >= 0) treeParent[s] = numberOf[above[k]];
    }
    return { count, parent: treeParent, vertexStart, vertices, operations: this.operations };
  }

  /** Children whose subtrees need the most room beyond what they leave behind go first. */
  private leastStackPostorder(hostOf: Int32Array, above: Int32Array): number[] {
    const { n } = this;
    const children = childLists(above);
    const peak = new Float64Array(n);
    const left = new Float64Array(n);
    for (let k = 0; k < n; k++) {
      if (hostOf[k] !== k) continue;
      left[k] = (this.front[k] - this.pivots[k]) ** 2;
      children[k].sort((a, b) => peak[b] - left[b] - (peak[a] - left[a]));
      let held = 0;
      for (const c of children[k]) {
        peak[k] = Math.max(peak[k], held + peak[c]);
        held += left[c];
      }
      peak[k] = Math.max(peak[k], held, left[k]);
    }
    const sequence: number[] = [];
    const stack: number[] = [];
    for (let k = n - 1; k >= 0; k--) if (hostOf[k] === k && above[k] < 0) stack.push(k);
    // Parents before children and children from last to first, then reversed.
    stack.reverse();
    for (let k = stack.pop(); k !== undefined; k = stack.pop()) {
      sequence.push(k);
      for (const c of children[k]) stack.push(c);
    }
    return sequence.reverse();
  }
}

function childLists(parent: Int32Array): number[][] {
  const lists: number[][] = Array.from({ length: parent.length }, () => []);
  for (let k = 0; k < parent.length; k++) if (parent[k] >= 0) lists[parent[k]].push(k);
  return lists;
}
