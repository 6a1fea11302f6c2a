import { describe, expect, it } from "vitest";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { equilibrationExponents } from "../../src/numerics/sparse/equilibration.js";
import { minimumDegree } from "../../src/numerics/sparse/minimum-degree.js";
import { nestedDissection } from "../../src/numerics/sparse/nested-dissection.js";
import { type Graph, nodeGraph } from "../../src/numerics/sparse/node-graph.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";
import { supernodeTree } from "../../src/numerics/sparse/supernodes.js";
import { SEPARATOR, vertexSeparator } from "../../src/numerics/sparse/vertex-separator.js";
import { awkwardCase, plateCase } from "./sparse-cases.js";

const graphOf = (side: number): Graph => {
  const plate = plateCase(side, 1);
  return nodeGraph(plate.a, plate.groups).graph;
};

const sorted = (order: Int32Array): number[] => Array.from(order).sort((a, b) => a - b);
const numbers = (n: number): number[] => Array.from({ length: n }, (_, i) => i);

/** Vertices in L by elimination of one vertex after the other on sets of neighbours. */
function fillOf(graph: Graph, order: Int32Array): number {
  const near = numbers(graph.order).map(
    (v) => new Set(graph.adjacent.subarray(graph.start[v], graph.start[v + 1])),
  );
  let fill = 0;
  for (const v of order) {
    const later = Array.from(near[v]!);
    fill += later.length + 1;
    for (const u of later) {
      near[u]!.delete(v);
      for (const w of later) if (w !== u) near[u]!.add(w);
    }
  }
  return fill;
}

describe("elimination orders", () => {
  it("contain every vertex once, whatever the structure", () => {
    for (let seed = 1; seed <= 100; seed++) {
      const { graph } = nodeGraph(awkwardCase(seed, true).a);
      expect(sorted(minimumDegree(graph))).toEqual(numbers(graph.order));
      expect(sorted(nestedDissection(graph))).toEqual(numbers(graph.order));
    }
  });

  it("contain every vertex of a grid of 2500 nodes once", () => {
    const graph = graphOf(50);
    expect(sorted(minimumDegree(graph))).toEqual(numbers(2500));
    expect(sorted(nestedDissection(graph))).toEqual(numbers(2500));
  });

  it("leave a tree without fill under minimum degree", () => {
    const n = 200;
    const rows = numbers(n - 1).map((i) => i + 1);
    const cols = rows.map((i) => Math.floor((i - 1) / 3));
    const a = fromTriplets(
      n,
      n,
      [...rows, ...cols, ...numbers(n)],
      [...cols, ...rows, ...numbers(n)],
      new Float64Array(3 * n - 2).fill(1),
    );
    const { graph } = nodeGraph(a, Int32Array.from(numbers(n)));
    expect(fillOf(graph, minimumDegree(graph))).toBe(2 * n - 1);
  });

  it("order the interior only when a border is given", () => {
    const graph = graphOf(8);
    expect(sorted(minimumDegree(graph, 40))).toEqual(numbers(40));
  });

  it("need a quarter less fill than the natural order of a grid of 1024 nodes", () => {
    const graph = graphOf(32);
    const natural = fillOf(graph, Int32Array.from(numbers(graph.order)));
    // Bandwidth 33 gives about 34 vertices per column.
    expect(natural).toBeGreaterThan(30_000);
    expect(fillOf(graph, minimumDegree(graph))).toBeLessThan(0.72 * natural);
    expect(fillOf(graph, nestedDissection(graph))).toBeLessThan(0.72 * natural);
  });
});

/** A grid of width × length nodes whose neighbours touch by side or corner. */
function gridGraph(width: number, length: number): Graph {
  const rows: number[] = [];
  const cols: number[] = [];
  for (let x = 0; x < width; x++) {
    for (let y = 0; y < length; y++) {
      for (let u = Math.max(0, x - 1); u <= Math.min(width - 1, x + 1); u++) {
        for (let v = Math.max(0, y - 1); v <= Math.min(length - 1, y + 1); v++) {
          rows.push(u * length + v);
          cols.push(x * length + y);
        }
      }
    }
  }
  const n = width * length;
  return nodeGraph(fromTriplets(n, n, rows, cols, rows), Int32Array.from(numbers(n))).graph;
}

describe("nested dissection", () => {
  it("eliminates a vertex that touches all others last", () => {
    const n = 3000;
    const others = numbers(n).slice(1);
    const hub = others.map(() => 0);
    const rows = [...numbers(n), ...hub, ...others];
    const cols = [...numbers(n), ...others, ...hub];
    const { graph } = nodeGraph(fromTriplets(n, n, rows, cols, rows));
    expect(nestedDissection(graph)[n - 1]).toBe(0);
  });

  it("needs fewer operations than minimum degree on a wide grid and more on some narrow one", () => {
    const wide = gridGraph(60, 60);
    const operations = (graph: Graph, order: Int32Array) => supernodeTree(graph, order).operations;
    expect(operations(wide, nestedDissection(wide))).toBeLessThan(operations(wide, minimumDegree(wide)));
    const narrow = gridGraph(3, 700);
    expect(operations(narrow, minimumDegree(narrow))).toBeLessThan(
      operations(narrow, nestedDissection(narrow)),
    );
  });
});

describe("a vertex separator", () => {
  it("lets no edge join the two parts, balances them and is about one grid line", () => {
    const graph = graphOf(40);
    const part = vertexSeparator(graph);
    const size = [0, 0, 0];
    for (let v = 0; v < graph.order; v++) {
      size[part[v]!]!++;
      for (let p = graph.start[v]!; p < graph.start[v + 1]!; p++) {
        const other = part[graph.adjacent[p]!]!;
        expect(part[v] === SEPARATOR || other === SEPARATOR || other === part[v]).toBe(true);
      }
    }
    expect(Math.max(size[0]!, size[1]!)).toBeLessThanOrEqual(0.6 * graph.order);
    expect(size[SEPARATOR]).toBeLessThan(50);
  });
});

describe("the tree of fronts", () => {
  it("keeps the dofs of a group side by side and eliminates every dof once", () => {
    const plate = plateCase(20, 1);
    const analysis = analyse(plate.a, plate.groups);
    expect(sorted(analysis.pivots)).toEqual(numbers(1200));
    for (let k = 0; k < 1200; k += 3) {
      const node = plate.groups[analysis.pivots[k]!];
      expect([plate.groups[analysis.pivots[k + 1]!], plate.groups[analysis.pivots[k + 2]!]]).toEqual([
        node,
        node,
      ]);
    }
  });

  it("finds the nodes of a full three-dof pattern without being told", () => {
    const plate = plateCase(12, 1);
    expect(nodeGraph(plate.a).graph).toEqual(nodeGraph(plate.a, plate.groups).graph);
  });

  it("puts children before parents and passes every dof below on to the parent", () => {
    const plate = plateCase(30, 1);
    const { fronts, parent, pivotStart, pivots, belowStart, below } = analyse(plate.a);
    for (let s = 0; s < fronts; s++) {
      const list = below.subarray(belowStart[s], belowStart[s + 1]);
      const above = parent[s]!;
      if (above < 0) {
        expect(list.length).toBe(0);
        continue;
      }
      expect(above).toBeGreaterThan(s);
      const there = new Set(pivots.subarray(pivotStart[above], pivotStart[above + 1]));
      for (const dof of below.subarray(belowStart[above], belowStart[above + 1])) there.add(dof);
      expect(list.every((dof) => there.has(dof))).toBe(true);
    }
  });

  it("stores at most a fifth more than the fill of the order it was made from", () => {
    const graph = graphOf(40);
    const order = minimumDegree(graph);
    const plate = plateCase(40, 1);
    const tree = supernodeTree(graph, order);
    expect(sorted(tree.vertices)).toEqual(numbers(graph.order));
    const { predictedNonzeros } = analyse(plate.a, plate.groups);
    // Nine entries per pair of nodes, L and U; the analysis may take the better of two orders.
    expect(predictedNonzeros).toBeLessThan(1.2 * 18 * fillOf(graph, order));
  });
});

describe("equilibration", () => {
  it("brings the largest entry of every row between 1/4 and 4 over 24 decades", () => {
    for (let seed = 1; seed <= 70; seed++) {
      const { a, im } = awkwardCase(seed, false);
      const modulus = a.values.map((re, p) => Math.hypot(re, im[p]!));
      const exponents = equilibrationExponents(a, modulus);
      const largest = new Float64Array(a.rows);
      for (let j = 0; j < a.cols; j++) {
        for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
          const scaled = modulus[p]! * 2 ** (exponents[a.rowIndex[p]!]! + exponents[j]!);
          largest[a.rowIndex[p]!] = Math.max(largest[a.rowIndex[p]!]!, scaled);
          largest[j] = Math.max(largest[j]!, scaled);
        }
      }
      for (const value of largest) {
        expect(value).toBeGreaterThan(1 / 4);
        expect(value).toBeLessThan(4);
      }
    }
  });

  it("leaves empty rows alone", () => {
    const a = fromTriplets(2, 2, [0, 1], [0, 1], [0, 16]);
    expect(Array.from(equilibrationExponents(a, a.values))).toEqual([0, -2]);
  });
});
