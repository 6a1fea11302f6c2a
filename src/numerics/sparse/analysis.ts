/**
 * What depends on the pattern alone: elimination order, tree of fronts, the dofs of each front
 * and the place of every matrix entry in its front. One analysis serves all values on a pattern.
 *
 * Source: Duff & Reid, ACM TOMS 9(3), 1983 (multifrontal method).
 */

import { invariant } from "../../errors.js";
import { denseLast } from "./dense-vertices.js";
import { childLists, eliminationTree } from "./elimination-tree.js";
import { minimumDegree } from "./minimum-degree.js";
import { nestedDissection } from "./nested-dissection.js";
import { type Graph, membersByNode, type NodeGraph, nodeGraph } from "./node-graph.js";
import type { SparsePattern } from "./sparse-matrix.js";
import { type SupernodeTree, supernodesOf } from "./supernodes.js";

/**
 * Fronts are numbered in the order of elimination, children before parents. The front s holds
 * the dofs it eliminates, `pivots[pivotStart[s] … pivotStart[s + 1])`, and below them those it
 * updates, `below[belowStart[s] … belowStart[s + 1])`, in the order of their elimination.
 */
export interface SymbolicAnalysis {
  readonly order: number;
  /** Entries of L and U together, pivots once, when no pivot is delayed. */
  readonly predictedNonzeros: number;
  readonly fronts: number;
  /** Front that receives the update of each front, −1 for a root. */
  readonly parent: Int32Array;
  readonly pivotStart: Int32Array;
  readonly pivots: Int32Array;
  readonly belowStart: Int32Array;
  readonly below: Int32Array;
  /** The matrix entries assembled into front s are `entries[entryStart[s] … entryStart[s + 1])`, */
  readonly entryStart: Int32Array;
  /** as positions in the pattern, */
  readonly entries: Int32Array;
  /** with their places in the front, column after column. */
  readonly entryPlace: Int32Array;
  readonly largestFront: number;
  /** Most entries of square update matrices that wait at the same time. */
  readonly stackPeak: number;
}

/**
 * @param pattern - Square, structurally symmetric, with full diagonal.
 * @param groups - Optional node number of each dof; dofs with the same number stay together.
 */
export function analyse(pattern: SparsePattern, groups?: Int32Array): SymbolicAnalysis {
  invariant(
    pattern.rows === pattern.cols,
    `analyse: a ${pattern.rows}×${pattern.cols} pattern is not square`,
  );
  const nodes = nodeGraph(pattern, groups);
  const tree = cheapestTree(nodes.graph);
  const fronts = frontDofs(nodes, tree);
  return {
    order: pattern.cols,
    fronts: tree.count,
    parent: tree.parent,
    ...fronts,
    ...sizes(tree, fronts),
    ...entryPlaces(pattern, tree.count, fronts),
  };
}

/** Dissection wins on wide models, minimum degree on long narrow ones; it costs a tenth of the dissection. */
function cheapestTree(graph: Graph): SupernodeTree {
  const dissected = eliminationTree(graph, denseLast(graph, nestedDissection));
  const greedy = eliminationTree(graph, denseLast(graph, minimumDegree));
  return supernodesOf(graph, greedy.operations < dissected.operations ? greedy : dissected);
}

type FrontDofs = Pick<SymbolicAnalysis, "pivotStart" | "pivots" | "belowStart" | "below">;

function frontDofs({ graph, nodeOf }: NodeGraph, tree: SupernodeTree): FrontDofs {
  const { memberStart, members } = membersByNode(nodeOf, graph.weight);
  const { nodeStart, nodes } = verticesBelow(graph, tree);
  const pivotStart = new Int32Array(tree.count + 1);
  const pivots = new Int32Array(nodeOf.length);
  let end = 0;
  for (let s = 0; s < tree.count; s++) {
    for (let t = tree.vertexStart[s]; t < tree.vertexStart[s + 1]; t++) {
      const v = tree.vertices[t];
      for (let m = memberStart[v]; m < memberStart[v + 1]; m++) pivots[end++] = members[m];
    }
    pivotStart[s + 1] = end;
  }
  const belowStart = new Int32Array(tree.count + 1);
  for (let s = 0; s < tree.count; s++) {
    belowStart[s + 1] = belowStart[s];
    for (let t = nodeStart[s]; t < nodeStart[s + 1]; t++) belowStart[s + 1] += graph.weight[nodes[t]];
  }
  const below = new Int32Array(belowStart[tree.count]);
  end = 0;
  for (let t = 0; t < nodeStart[tree.count]; t++) {
    const v = nodes[t];
    for (let m = memberStart[v]; m < memberStart[v + 1]; m++) below[end++] = members[m];
  }
  return { pivotStart, pivots, belowStart, below };
}

/**
 * For each supernode s the later vertices in its columns of L, from its own edges and its
 * children, in the order of their elimination: `nodes[nodeStart[s] … nodeStart[s + 1])`.
 */
function verticesBelow(
  graph: Graph,
  tree: SupernodeTree,
): { readonly nodeStart: Int32Array; readonly nodes: Int32Array } {
  const { count, parent, vertexStart, vertices } = tree;
  const { first, next } = childLists(parent);
  const positionOf = new Int32Array(graph.order);
  for (let k = 0; k < vertices.length; k++) positionOf[vertices[k]] = k;
  const adjacentPlaces = graph.adjacent.map((u) => positionOf[u]);
  const nodeStart = new Int32Array(count + 1);
  let places = new Int32Array(8 * graph.order);
  const list = new Int32Array(graph.order);
  const seen = new Int32Array(graph.order).fill(-1);
  for (let s = 0; s < count; s++) {
    const end = vertexStart[s + 1];
    let length = 0;
    for (let c = first[s]; c >= 0; c = next[c]) {
      length = enterNew(list, length, seen, s, end, places, nodeStart[c], nodeStart[c + 1]);
    }
    for (let t = vertexStart[s]; t < end; t++) {
      const v = vertices[t];
      length = enterNew(list, length, seen, s, end, adjacentPlaces, graph.start[v], graph.start[v + 1]);
    }
    const begin = nodeStart[s];
    if (begin + length > places.length) places = enlarged(places, begin + length);
    places.set(list.subarray(0, length).sort(), begin);
    nodeStart[s + 1] = begin + length;
  }
  const nodes = places.subarray(0, nodeStart[count]);
  for (let t = 0; t < nodes.length; t++) nodes[t] = vertices[nodes[t]];
  return { nodeStart, nodes };
}

/** Appends the places from `end` on among `source[from … to)` that list s lacks; returns the new length. */
function enterNew(
  list: Int32Array,
  length: number,
  seen: Int32Array,
  s: number,
  end: number,
  source: Int32Array,
  from: number,
  to: number,
): number {
  let next = length;
  for (let t = from; t < to; t++) {
    const k = source[t];
    if (k < end || seen[k] === s) continue;
    seen[k] = s;
    list[next++] = k;
  }
  return next;
}

function enlarged(array: Int32Array<ArrayBuffer>, least: number): Int32Array<ArrayBuffer> {
  const larger = new Int32Array(Math.max(least, Math.ceil(1.5 * array.length)));
  larger.set(array);
  return larger;
}

function sizes(
  tree: SupernodeTree,
  { pivotStart, belowStart }: FrontDofs,
): Pick<SymbolicAnalysis, "predictedNonzeros" | "largestFront" | "stackPeak"> {
  let predictedNonzeros = 0;
  let largestFront = 0;
  let stackPeak = 0;
  let held = 0;
  const waiting = new Float64Array(tree.count);
  for (let s = 0; s < tree.count; s++) {
    const p = pivotStart[s + 1] - pivotStart[s];
    const b = belowStart[s + 1] - belowStart[s];
    predictedNonzeros += p * (p + 2 * b);
    largestFront = Math.max(largestFront, p + b);
    held += b * b - waiting[s];
    stackPeak = Math.max(stackPeak, held);
    if (tree.parent[s] >= 0) waiting[tree.parent[s]] += b * b;
  }
  return { predictedNonzeros, largestFront, stackPeak };
}

type EntryPlaces = Pick<SymbolicAnalysis, "entryStart" | "entries" | "entryPlace">;

/** Entry (i, j) goes to the front that eliminates the earlier of i and j. */
function entryPlaces(pattern: SparsePattern, fronts: number, dofs: FrontDofs): EntryPlaces {
  const { cols, colStart, rowIndex } = pattern;
  const { pivotStart, pivots, belowStart, below } = dofs;
  const frontOf = new Int32Array(cols);
  for (let s = 0; s < fronts; s++) {
    for (let t = pivotStart[s]; t < pivotStart[s + 1]; t++) frontOf[pivots[t]] = s;
  }
  const entryStart = new Int32Array(fronts + 1);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      entryStart[Math.min(frontOf[j], frontOf[rowIndex[p]]) + 1]++;
    }
  }
  for (let s = 0; s < fronts; s++) entryStart[s + 1] += entryStart[s];
  const next = entryStart.slice(0, fronts);
  const entries = new Int32Array(rowIndex.length);
  const entryPlace = new Int32Array(rowIndex.length);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const t = next[Math.min(frontOf[j], frontOf[rowIndex[p]])]++;
      entries[t] = p;
      entryPlace[t] = j;
    }
  }
  const placeOf = new Int32Array(cols).fill(-1);
  for (let s = 0; s < fronts; s++) {
    let place = 0;
    for (let t = pivotStart[s]; t < pivotStart[s + 1]; t++) placeOf[pivots[t]] = place++;
    for (let t = belowStart[s]; t < belowStart[s + 1]; t++) placeOf[below[t]] = place++;
    for (let t = entryStart[s]; t < entryStart[s + 1]; t++) {
      entryPlace[t] = placeOf[rowIndex[entries[t]]] + placeOf[entryPlace[t]] * place;
    }
  }
  return { entryStart, entries, entryPlace };
}
