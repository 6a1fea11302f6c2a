/**
 * From an elimination order to the tree of dense fronts: columns joined with their parents
 * where few stored zeros result, in an order that keeps the stack of updates low.
 *
 * Sources: Ashcraft & Grimes, ACM TOMS 15(4), 1989 (relaxed supernodes); Liu, ACM TOMS 12(3),
 * 1986 (postorder for least stack).
 */

import { childLists, type EliminationTree, eliminationTree } from "./elimination-tree.js";
import type { Graph } from "./node-graph.js";

/** The supernodes in the order of their elimination, children before parents. */
export interface SupernodeTree {
  readonly count: number;
  /** Parent of each supernode, −1 for a root. */
  readonly parent: Int32Array;
  /** The vertices of supernode s, in elimination order, are `vertices[vertexStart[s] … vertexStart[s + 1])`. */
  readonly vertexStart: Int32Array;
  readonly vertices: Int32Array;
  /** Sum of the squared column lengths of L over the dofs, stored zeros left out, to compare orders by. */
  readonly operations: number;
}

/** @param order - The vertices of the graph in the order of their elimination. */
export function supernodeTree(graph: Graph, order: Int32Array): SupernodeTree {
  return supernodesOf(graph, eliminationTree(graph, order));
}

export function supernodesOf(graph: Graph, tree: EliminationTree): SupernodeTree {
  return new Amalgamation(graph, tree).tree();
}

/** Entries of a column block: p columns in a front of order f, lower trapezoid. */
function trapezoid(p: number, f: number): number {
  return p * f - (p * (p - 1)) / 2;
}

/**
 * Share of stored zeros that a supernode with p columns may carry. The time of the complex LU is flat
 * around these values, on plates and slabs of 10 000 to 30 000 dofs: 0.5 for few columns costs 10 %
 * more on some, and much smaller shares save storage but leave many fronts of one node.
 */
function allowedZeros(p: number): number {
  if (p <= 16) return 0.35;
  if (p <= 48) return 0.15;
  return 0.05;
}

class Amalgamation {
  private readonly elimination: EliminationTree;
  private readonly n: number;
  /** Dofs eliminated in the supernode that column k heads, its front, and the zeros it stores. */
  private readonly pivots: Float64Array;
  private readonly front: Float64Array;
  private readonly zeros: Float64Array;
  /** Column that took column k over, or k. */
  private readonly host: Int32Array;
  /** Children of one column at a time. */
  private readonly family: Int32Array;

  constructor(graph: Graph, elimination: EliminationTree) {
    const n = graph.order;
    this.n = n;
    this.elimination = elimination;
    this.front = elimination.length.slice();
    this.pivots = new Float64Array(n);
    this.zeros = new Float64Array(n);
    this.host = new Int32Array(n);
    this.family = new Int32Array(n);
    for (let k = 0; k < n; k++) {
      this.pivots[k] = graph.weight[elimination.order[k]];
      this.host[k] = k;
    }
  }

  tree(): SupernodeTree {
    const { front, pivots } = this;
    const children = childLists(this.elimination.parent);
    // Children with the largest remainder first: they share most with the parent.
    const byRemainder = (a: number, b: number): number => front[b] - pivots[b] - front[a] + pivots[a];
    for (let k = 0; k < this.n; k++) {
      for (const c of this.sortedFamily(children.first[k], children.next, byRemainder)) this.tryToJoin(c, k);
    }
    return this.supernodes();
  }

  /** The list from `first` on, sorted; valid until the next call. */
  private sortedFamily(
    first: number,
    next: Int32Array,
    compare: (a: number, b: number) => number,
  ): Int32Array {
    let count = 0;
    for (let c = first; c >= 0; c = next[c]) this.family[count++] = c;
    const family = this.family.subarray(0, count);
    return count > 1 ? family.sort(compare) : family;
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

  private supernodes(): SupernodeTree {
    const { n, host } = this;
    const { order, parent, operations } = this.elimination;
    // A host stands after the columns it took over, so one pass downwards finds the final hosts.
    for (let k = n - 1; k >= 0; k--) host[k] = host[host[k]];
    const above = new Int32Array(n).fill(-1);
    const members = new Int32Array(n);
    for (let k = 0; k < n; k++) {
      members[host[k]]++;
      if (host[k] === k && parent[k] >= 0) above[k] = host[parent[k]];
    }
    const sequence = this.leastStackPostorder(above);
    const count = sequence.length;
    const numberOf = new Int32Array(n);
    const vertexStart = new Int32Array(count + 1);
    for (let s = 0; s < count; s++) {
      numberOf[sequence[s]] = s;
      vertexStart[s + 1] = vertexStart[s] + members[sequence[s]];
    }
    const treeParent = new Int32Array(count);
    for (let s = 0; s < count; s++)
      treeParent[s] = above[sequence[s]] < 0 ? -1 : numberOf[above[sequence[s]]];
    const vertices = new Int32Array(n);
    const next = vertexStart.slice(0, count);
    for (let k = 0; k < n; k++) vertices[next[numberOf[host[k]]]++] = order[k];
    return { count, parent: treeParent, vertexStart, vertices, operations };
  }

  /** Hosts, children first; children whose subtrees need the most room beyond what they leave go first. */
  private leastStackPostorder(above: Int32Array): Int32Array {
    const { n, host } = this;
    const { first, next } = childLists(above);
    const peak = new Float64Array(n);
    const left = new Float64Array(n);
    const byRoom = (a: number, b: number): number => peak[b] - left[b] - peak[a] + left[a];
    let hosts = 0;
    for (let k = 0; k < n; k++) {
      if (host[k] !== k) continue;
      hosts++;
      left[k] = (this.front[k] - this.pivots[k]) ** 2;
      let held = 0;
      let last = -1;
      for (const c of this.sortedFamily(first[k], next, byRoom)) {
        peak[k] = Math.max(peak[k], held + peak[c]);
        held += left[c];
        if (last < 0) first[k] = c;
        else next[last] = c;
        next[c] = -1;
        last = c;
      }
      peak[k] = Math.max(peak[k], held, left[k]);
    }
    return this.childrenFirst(hosts, above, first, next);
  }

  private childrenFirst(hosts: number, above: Int32Array, first: Int32Array, next: Int32Array): Int32Array {
    const sequence = new Int32Array(hosts);
    // Filled from the end: parents, then their children from last to first.
    const stack = this.family;
    let waiting = 0;
    let place = hosts;
    for (let k = 0; k < this.n; k++) if (this.host[k] === k && above[k] < 0) stack[waiting++] = k;
    while (waiting > 0) {
      const k = stack[--waiting];
      sequence[--place] = k;
      for (let c = first[k]; c >= 0; c = next[c]) stack[waiting++] = c;
    }
    return sequence;
  }
}
