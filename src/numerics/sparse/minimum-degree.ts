/**
 * Approximate minimum degree ordering on a quotient graph: eliminated vertices become
 * elements (cliques kept as vertex lists), vertices with equal lists are joined, and the
 * degree of a vertex is bounded by the sizes of its elements outside the newest one.
 *
 * Source: Amestoy, Davis, Duff, SIAM J. Matrix Anal. Appl. 17(4), 1996, pp. 886–905; the
 * border that is seen but not eliminated: Pellegrini, Roman, Amestoy, Concurrency 12, 2000.
 */

import type { Graph } from "./node-graph.js";

/**
 * Elimination order of the vertices 0 … interior − 1. Vertices from `interior` on are a border
 * eliminated later by someone else: they count in degrees but are not ordered.
 *
 * @returns the interior vertices in the order of their elimination.
 */
export function minimumDegree(graph: Graph, interior: number = graph.order): Int32Array {
  return new QuotientGraph(graph, interior).eliminateAll();
}

class QuotientGraph {
  private readonly order: number;
  private readonly interior: number;
  /** Lists of all vertices and elements: elements first, then plain neighbours. */
  private lists: Int32Array;
  private free: number;
  private readonly at: Int32Array;
  private readonly length: Int32Array;
  private readonly elements: Int32Array;
  private readonly scratch: Int32Array;
  private readonly seen: Int32Array;
  private mark = 0;
  private readonly alive: Uint8Array;
  /** Weight of a live vertex, negated while it stands in the newest element, 0 once gone. */
  private readonly weight: Int32Array;
  /** Degree bound of a vertex; weight of an element's live vertices. */
  private readonly degree: Float64Array;
  private readonly outside: Float64Array;
  private stamp = 1;
  private readonly head: Int32Array;
  private readonly next: Int32Array;
  private readonly previous: Int32Array;
  private leastDegree = 0;
  private totalWeight = 0;
  /** Vertices joined to one another, as rings, so that they leave together. */
  private readonly ring: Int32Array;

  constructor(graph: Graph, interior: number) {
    const n = graph.order;
    this.order = n;
    this.interior = interior;
    this.free = graph.adjacent.length;
    this.lists = new Int32Array(this.free + (this.free >> 2) + n + 1);
    this.lists.set(graph.adjacent);
    this.at = graph.start.slice(0, n);
    this.length = new Int32Array(n);
    this.elements = new Int32Array(n);
    this.scratch = new Int32Array(n + 1);
    this.seen = new Int32Array(n);
    this.alive = new Uint8Array(n).fill(1);
    this.weight = Int32Array.from(graph.weight);
    this.degree = new Float64Array(n);
    this.outside = new Float64Array(n);
    this.next = new Int32Array(n).fill(-1);
    this.previous = new Int32Array(n).fill(-1);
    this.ring = new Int32Array(n);
    for (let v = 0; v < n; v++) {
      this.ring[v] = v;
      this.totalWeight += graph.weight[v];
    }
    this.head = new Int32Array(this.totalWeight + 1).fill(-1);
    for (let v = 0; v < n; v++) {
      this.length[v] = graph.start[v + 1] - graph.start[v];
      for (let p = graph.start[v]; p < graph.start[v + 1]; p++)
        this.degree[v] += graph.weight[graph.adjacent[p]];
    }
    // Backwards, so that equal degrees leave in the order of their numbers.
    for (let v = interior - 1; v >= 0; v--) this.insert(v);
  }

  eliminateAll(): Int32Array {
    const result = new Int32Array(this.interior);
    const buckets = new Map<number, number>();
    let done = 0;
    while (done < this.interior) {
      const pivot = this.takeLeast();
      this.formElement(pivot);
      this.measureOutside(pivot);
      this.updateMembers(pivot, buckets);
      this.joinAlike(buckets);
      this.closeElement(pivot);
      let v = pivot;
      do {
        result[done++] = v;
        v = this.ring[v];
      } while (v !== pivot);
    }
    return result;
  }

  private insert(v: number): void {
    if (v >= this.interior) return;
    const d = Math.min(this.degree[v], this.totalWeight);
    const first = this.head[d];
    this.next[v] = first;
    this.previous[v] = -1;
    if (first >= 0) this.previous[first] = v;
    this.head[d] = v;
    if (d < this.leastDegree) this.leastDegree = d;
  }

  private remove(v: number): void {
    if (v >= this.interior) return;
    const after = this.next[v];
    const before = this.previous[v];
    if (after >= 0) this.previous[after] = before;
    if (before >= 0) this.next[before] = after;
    else this.head[Math.min(this.degree[v], this.totalWeight)] = after;
  }

  private takeLeast(): number {
    while (this.head[this.leastDegree] < 0) this.leastDegree++;
    const v = this.head[this.leastDegree];
    this.remove(v);
    return v;
  }

  /** Gathers the pivot's neighbours, and those of its elements, into one new element. */
  private formElement(pivot: number): void {
    const { at, length, weight } = this;
    let needed = length[pivot];
    for (let p = at[pivot]; p < at[pivot] + this.elements[pivot]; p++) needed += length[this.lists[p]];
    if (this.free + needed > this.lists.length) this.compact(needed);
    const lists = this.lists;
    weight[pivot] = -weight[pivot];
    const begin = this.free;
    const firstPlain = at[pivot] + this.elements[pivot];
    for (let p = at[pivot]; p < firstPlain; p++) {
      const e = lists[p];
      this.collect(at[e], at[e] + length[e]);
      this.alive[e] = 0;
    }
    this.collect(firstPlain, at[pivot] + length[pivot]);
    at[pivot] = begin;
    length[pivot] = this.free - begin;
  }

  private collect(from: number, to: number): void {
    const { lists, weight } = this;
    for (let p = from; p < to; p++) {
      const v = lists[p];
      if (weight[v] <= 0) continue;
      weight[v] = -weight[v];
      lists[this.free++] = v;
      this.remove(v);
    }
  }

  /** For every element met from the newest one: the weight of its vertices outside the newest one. */
  private measureOutside(pivot: number): void {
    const { lists, at, outside, degree } = this;
    const stamp = this.stamp;
    for (let q = at[pivot]; q < at[pivot] + this.length[pivot]; q++) {
      const v = lists[q];
      const w = -this.weight[v];
      for (let p = at[v]; p < at[v] + this.elements[v]; p++) {
        const e = lists[p];
        if (this.alive[e] === 0) continue;
        if (outside[e] < stamp) outside[e] = degree[e] + stamp;
        outside[e] -= w;
      }
    }
  }

  /** Rewrites the members' lists, bounds their degrees, eliminates those seen by the newest element only. */
  private updateMembers(pivot: number, buckets: Map<number, number>): void {
    const { lists, at, length, degree } = this;
    buckets.clear();
    for (let q = at[pivot]; q < at[pivot] + length[pivot]; q++) {
      const v = lists[q];
      const bound = this.rewriteList(v, pivot);
      if (bound === 0 && v < this.interior) {
        this.absorb(v, pivot);
        continue;
      }
      degree[v] = Math.min(degree[v], bound);
      let hash = length[v];
      for (let p = at[v]; p < at[v] + length[v]; p++) hash += lists[p];
      this.next[v] = buckets.get(hash) ?? -1;
      buckets.set(hash, v);
    }
  }

  /** The list of v becomes: newest element, live elements, neighbours no element covers. Returns their weight outside the newest. */
  private rewriteList(v: number, pivot: number): number {
    const { lists, scratch, outside, alive, weight } = this;
    const begin = this.at[v];
    const firstPlain = begin + this.elements[v];
    const end = begin + this.length[v];
    let bound = 0;
    let count = 0;
    scratch[count++] = pivot;
    for (let p = begin; p < firstPlain; p++) {
      const e = lists[p];
      if (alive[e] === 0) continue;
      const rest = outside[e] - this.stamp;
      if (rest > 0) {
        bound += rest;
        scratch[count++] = e;
      } else {
        alive[e] = 0;
      }
    }
    this.elements[v] = count;
    for (let p = firstPlain; p < end; p++) {
      const u = lists[p];
      if (weight[u] <= 0) continue;
      bound += weight[u];
      scratch[count++] = u;
    }
    // The list cannot have grown: the pivot, or an element it took over, has left it.
    for (let t = 0; t < count; t++) lists[begin + t] = scratch[t];
    this.length[v] = count;
    return bound;
  }

  /** v leaves together with `host`. */
  private absorb(v: number, host: number): void {
    this.weight[host] += this.weight[v];
    this.weight[v] = 0;
    this.alive[v] = 0;
    this.length[v] = 0;
    const after = this.ring[v];
    this.ring[v] = this.ring[host];
    this.ring[host] = after;
  }

  /** Joins members whose lists are equal as sets. */
  private joinAlike(buckets: Map<number, number>): void {
    for (const first of buckets.values()) {
      for (let i = first; i >= 0; i = this.next[i]) {
        if (this.weight[i] === 0 || this.next[i] < 0) continue;
        this.mark++;
        for (let p = this.at[i]; p < this.at[i] + this.length[i]; p++) this.seen[this.lists[p]] = this.mark;
        for (let j = this.next[i]; j >= 0; j = this.next[j]) {
          if (this.weight[j] !== 0 && this.isAlike(i, j)) this.absorb(j, i);
        }
      }
    }
  }

  private isAlike(i: number, j: number): boolean {
    if (this.length[i] !== this.length[j] || this.elements[i] !== this.elements[j]) return false;
    if (i < this.interior !== j < this.interior) return false;
    for (let p = this.at[j]; p < this.at[j] + this.length[j]; p++) {
      if (this.seen[this.lists[p]] !== this.mark) return false;
    }
    return true;
  }

  /** Drops vanished members and returns the others to the degree lists. */
  private closeElement(pivot: number): void {
    const { lists, at, weight, degree } = this;
    const begin = at[pivot];
    const end = begin + this.length[pivot];
    let size = 0;
    let write = begin;
    for (let q = begin; q < end; q++) {
      const v = lists[q];
      if (weight[v] === 0) continue;
      weight[v] = -weight[v];
      size += weight[v];
      lists[write++] = v;
    }
    this.length[pivot] = write - begin;
    this.free = write;
    degree[pivot] = size;
    this.alive[pivot] = write > begin ? 1 : 0;
    weight[pivot] = 0;
    for (let q = begin; q < write; q++) {
      const v = lists[q];
      degree[v] += size - weight[v];
      this.insert(v);
    }
    this.stamp += 2 * this.totalWeight + 2;
  }

  /** Moves the live lists together, with room for `needed` more. */
  private compact(needed: number): void {
    let total = 0;
    for (let v = 0; v < this.order; v++) if (this.alive[v] === 1) total += this.length[v];
    const moved = new Int32Array(total + (total >> 2) + needed + this.order);
    let end = 0;
    for (let v = 0; v < this.order; v++) {
      if (this.alive[v] === 0) continue;
      const from = this.at[v];
      this.at[v] = end;
      for (let t = 0; t < this.length[v]; t++) moved[end++] = this.lists[from + t];
    }
    this.lists = moved;
    this.free = end;
  }
}
