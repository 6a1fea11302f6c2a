/**
 * Vertices joined to a large share of all others, as contact nodes and constraints of a whole
 * face are: they make every ordering slow and poor, and belong at the end of any.
 *
 * Source: Amestoy, Davis, Duff, ACM TOMS 30(3), 2004, p. 384 (dense rows in minimum degree).
 */

import { type Graph, inducedGraph } from "./node-graph.js";

/** An order of all vertices: that of `orderOf` for the graph without dense vertices, then these by rising degree. */
export function denseLast(graph: Graph, orderOf: (sparse: Graph) => Int32Array): Int32Array {
  const { order, start } = graph;
  const degree = (v: number): number => start[v + 1] - start[v];
  const limit = 16 + 10 * Math.sqrt(order);
  const others = new Int32Array(order);
  const dense: number[] = [];
  for (let v = 0; v < order; v++) {
    if (degree(v) > limit) dense.push(v);
    else others[v - dense.length] = v;
  }
  if (dense.length === 0) return orderOf(graph);
  const vertices = others.subarray(0, order - dense.length);
  const sparse = inducedGraph(graph, vertices, new Int32Array(order).fill(-1));
  const result = new Int32Array(order);
  result.set(orderOf(sparse).map((t) => vertices[t]));
  result.set(
    dense.sort((u, v) => degree(u) - degree(v)),
    vertices.length,
  );
  return result;
}
