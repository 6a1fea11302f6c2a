/**
 * Fill-reducing elimination order by nested dissection: split by a vertex separator, order
 * both parts first, the separator last; small parts by minimum degree.
 *
 * Source: George, SIAM J. Numer. Anal. 10(2), 1973; the combination with minimum degree:
 * Hendrickson & Rothberg, SIAM J. Sci. Comput. 20(2), 1998.
 */

import { createRandom, type Random } from "../random.js";
import { minimumDegree } from "./minimum-degree.js";
import { type Graph, inducedGraph } from "./node-graph.js";
import { vertexSeparator } from "./vertex-separator.js";

/** Parts up to this many vertices are ordered by minimum degree. */
const SMALL_PART = 200;

/** The vertices in the order of their elimination; equal graphs give equal orders. */
export function nestedDissection(graph: Graph): Int32Array {
  return new Dissection(graph).order();
}

/** Part of the graph, with the numbers its vertices have there. */
interface Piece {
  readonly graph: Graph;
  readonly vertices: Int32Array;
}

class Dissection {
  private readonly graph: Graph;
  private readonly random: Random = createRandom(1);
  private readonly result: Int32Array;
  private done = 0;
  private readonly local: Int32Array;

  constructor(graph: Graph) {
    this.graph = graph;
    this.result = new Int32Array(graph.order);
    this.local = new Int32Array(graph.order).fill(-1);
  }

  order(): Int32Array {
    const vertices = Int32Array.from({ length: this.graph.order }, (_, v) => v);
    this.dissect({ graph: this.graph, vertices });
    return this.result;
  }

  private append(vertices: Int32Array): void {
    this.result.set(vertices, this.done);
    this.done += vertices.length;
  }

  private dissect(piece: Piece): void {
    const { graph, vertices } = piece;
    if (graph.order <= SMALL_PART) {
      this.orderSmall(vertices);
      return;
    }
    const { componentOf, count } = connectedComponents(graph);
    if (count > 1) {
      this.dissectComponents(piece, componentOf, count);
      return;
    }
    const part = vertexSeparator(graph, this.random);
    const [zero, one, separator] = split(part, 3);
    if (zero.length === 0 || one.length === 0) {
      this.orderSmall(vertices);
      return;
    }
    this.dissect(this.piece(piece, zero));
    this.dissect(this.piece(piece, one));
    this.append(separator.map((t) => vertices[t]));
  }

  /** Crumbs are ordered in one go, so that a thousand loose vertices cost no thousand calls. */
  private dissectComponents(piece: Piece, componentOf: Int32Array, count: number): void {
    const crumbs: Int32Array[] = [];
    for (const own of split(componentOf, count)) {
      if (own.length > SMALL_PART) this.dissect(this.piece(piece, own));
      else crumbs.push(own);
    }
    const together = new Int32Array(crumbs.reduce((sum, own) => sum + own.length, 0));
    let end = 0;
    for (const own of crumbs) for (const t of own) together[end++] = piece.vertices[t];
    this.orderSmall(together);
  }

  /** By minimum degree, with the neighbours outside in sight. */
  private orderSmall(vertices: Int32Array): void {
    if (vertices.length === 0) return;
    const sub = this.withBorder(vertices);
    this.append(minimumDegree(sub, vertices.length).map((t) => vertices[t]));
  }

  /** The graph of these vertices and, numbered after them, their neighbours; without edges among the latter. */
  private withBorder(vertices: Int32Array): Graph {
    const { start, adjacent, weight } = this.graph;
    const { local } = this;
    const interior = vertices.length;
    const all = Array.from(vertices);
    const degree = all.map((v) => start[v + 1] - start[v]);
    for (let t = 0; t < interior; t++) local[all[t]] = t;
    for (let t = 0; t < interior; t++) {
      for (let p = start[all[t]]; p < start[all[t] + 1]; p++) {
        const u = adjacent[p];
        if (local[u] < 0) {
          local[u] = all.length;
          all.push(u);
          degree.push(0);
        }
        if (local[u] >= interior) degree[local[u]]++;
      }
    }
    const order = all.length;
    const subStart = new Int32Array(order + 1);
    for (let t = 0; t < order; t++) subStart[t + 1] = subStart[t] + degree[t];
    const next = subStart.slice(0, order);
    const subAdjacent = new Int32Array(subStart[order]);
    for (let t = 0; t < interior; t++) {
      for (let p = start[all[t]]; p < start[all[t] + 1]; p++) {
        const u = local[adjacent[p]];
        subAdjacent[next[t]++] = u;
        if (u >= interior) subAdjacent[next[u]++] = t;
      }
    }
    for (const v of all) local[v] = -1;
    return { order, start: subStart, adjacent: subAdjacent, weight: Int32Array.from(all, (v) => weight[v]) };
  }

  private piece({ graph, vertices }: Piece, chosen: Int32Array): Piece {
    return { graph: inducedGraph(graph, chosen, this.local), vertices: chosen.map((t) => vertices[t]) };
  }
}

/** The positions of every class, ascending. */
function split(classOf: ArrayLike<number>, classes: number): Int32Array[] {
  const size = new Int32Array(classes);
  for (let t = 0; t < classOf.length; t++) size[classOf[t]]++;
  const members = Array.from(size, (count) => new Int32Array(count));
  size.fill(0);
  for (let t = 0; t < classOf.length; t++) members[classOf[t]][size[classOf[t]]++] = t;
  return members;
}

function connectedComponents(graph: Graph): { readonly componentOf: Int32Array; readonly count: number } {
  const { order, start, adjacent } = graph;
  const componentOf = new Int32Array(order).fill(-1);
  const queue = new Int32Array(order);
  let count = 0;
  for (let seed = 0; seed < order; seed++) {
    if (componentOf[seed] >= 0) continue;
    componentOf[seed] = count;
    queue[0] = seed;
    for (let read = 0, end = 1; read < end; read++) {
      const v = queue[read];
      for (let p = start[v]; p < start[v + 1]; p++) {
        const u = adjacent[p];
        if (componentOf[u] >= 0) continue;
        componentOf[u] = count;
        queue[end++] = u;
      }
    }
    count++;
  }
  return { componentOf, count };
}
