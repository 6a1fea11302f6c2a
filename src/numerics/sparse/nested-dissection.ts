/**
 * Fill-reducing elimination order by nested dissection: split by a vertex separator, order
 * both parts first, the separator last; small parts by minimum degree.
 *
 * Source: George, SIAM J. Numer. Anal. 10(2), 1973; the combination with minimum degree:
 * Hendrickson & Rothberg, SIAM J. Sci. Comput. 20(2), 1998.
 */

import { minimumDegree } from "./minimum-degree.js";
import type { Graph } from "./node-graph.js";
import { SEPARATOR, vertexSeparator } from "./vertex-separator.js";

/** Parts up to this many vertices are ordered by minimum degree. */
const SMALL_PART = 200;

/** The vertices in the order of their elimination. */
export function nestedDissection(graph: Graph): Int32Array {
  return new Dissection(graph).order();
}

class Dissection {
  private readonly graph: Graph;
  private readonly result: Int32Array;
  private done = 0;
  private readonly local: Int32Array;

  constructor(graph: Graph) {
    this.graph = graph;
    this.result = new Int32Array(graph.order);
    this.local = new Int32Array(graph.order).fill(-1);
  }

  order(): Int32Array {
    this.dissect(Int32Array.from({ length: this.graph.order }, (_, v) => v));
    return this.result;
  }

  private append(vertices: ArrayLike<number>): void {
    for (let t = 0; t < vertices.length; t++) this.result[this.done++] = vertices[t];
  }

  private dissect(vertices: Int32Array): void {
    if (vertices.length <= SMALL_PART) {
      this.orderSmall(vertices);
      return;
    }
    const sub = this.induced(vertices, vertices.length);
    const components = connectedComponents(sub);
    if (components.length > 1) {
      this.dissectComponents(vertices, components);
      return;
    }
    const part = vertexSeparator(sub);
    const zero = vertices.filter((_, t) => part[t] === 0);
    const one = vertices.filter((_, t) => part[t] === 1);
    if (zero.length === 0 || one.length === 0) {
      this.orderSmall(vertices);
      return;
    }
    this.dissect(zero);
    this.dissect(one);
    this.append(vertices.filter((_, t) => part[t] === SEPARATOR));
  }

  /** Crumbs are ordered in one go, so that a thousand loose vertices cost no thousand calls. */
  private dissectComponents(vertices: Int32Array, components: readonly Int32Array[]): void {
    const crumbs: number[] = [];
    for (const component of components) {
      const own = component.map((t) => vertices[t]);
      if (own.length > SMALL_PART) this.dissect(own);
      else for (const v of own) crumbs.push(v);
    }
    this.orderSmall(Int32Array.from(crumbs));
  }

  private orderSmall(vertices: Int32Array): void {
    if (vertices.length === 0) return;
    const { start, adjacent } = this.graph;
    for (const v of vertices) this.local[v] = 0;
    const all = Array.from(vertices);
    for (const v of vertices) {
      for (let p = start[v]; p < start[v + 1]; p++) {
        if (this.local[adjacent[p]] >= 0) continue;
        this.local[adjacent[p]] = 0;
        all.push(adjacent[p]);
      }
    }
    for (const v of all) this.local[v] = -1;
    const sub = this.induced(Int32Array.from(all), all.length);
    this.append(minimumDegree(sub, vertices.length).map((t) => vertices[t]));
  }

  /** The graph of these vertices and the edges among them. */
  private induced(vertices: Int32Array, count: number): Graph {
    const { start, adjacent, weight } = this.graph;
    const { local } = this;
    let edges = 0;
    for (let t = 0; t < count; t++) {
      local[vertices[t]] = t;
      edges += start[vertices[t] + 1] - start[vertices[t]];
    }
    const subStart = new Int32Array(count + 1);
    const subAdjacent = new Int32Array(edges);
    const subWeight = new Int32Array(count);
    let end = 0;
    for (let t = 0; t < count; t++) {
      const v = vertices[t];
      subWeight[t] = weight[v];
      for (let p = start[v]; p < start[v + 1]; p++) {
        if (local[adjacent[p]] >= 0) subAdjacent[end++] = local[adjacent[p]];
      }
      subStart[t + 1] = end;
    }
    for (let t = 0; t < count; t++) local[vertices[t]] = -1;
    return { order: count, start: subStart, adjacent: subAdjacent.slice(0, end), weight: subWeight };
  }
}

function connectedComponents(graph: Graph): Int32Array[] {
  const { order, start, adjacent } = graph;
  const seen = new Uint8Array(order);
  const queue = new Int32Array(order);
  const components: Int32Array[] = [];
  let end = 0;
  for (let seed = 0; seed < order; seed++) {
    if (seen[seed] === 1) continue;
    const begin = end;
    seen[seed] = 1;
    queue[end++] = seed;
    for (let read = begin; read < end; read++) {
      const v = queue[read];
      for (let p = start[v]; p < start[v + 1]; p++) {
        const u = adjacent[p];
        if (seen[u] === 1) continue;
        seen[u] = 1;
        queue[end++] = u;
      }
    }
    components.push(queue.slice(begin, end));
  }
  return components;
}
