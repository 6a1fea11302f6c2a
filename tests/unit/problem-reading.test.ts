import { createHash } from "node:crypto";
import { cpSync, mkdirSync, mkdtempSync, readFileSync, rmSync, symlinkSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { gzipSync } from "node:zlib";
import { afterAll, describe, expect, it } from "vitest";
import type { Triplets } from "../../src/problem/problem.js";
import { readProblem } from "../../src/problem/read-problem.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-read-"));
afterAll(() => rmSync(folder, { recursive: true }));

let count = 0;
async function read(content: object, files: Record<string, string | Buffer> = {}) {
  const home = join(folder, `p${count++}`);
  mkdirSync(home);
  for (const [name, text] of Object.entries(files)) writeFileSync(join(home, name), text);
  writeFileSync(join(home, "problem.json"), JSON.stringify(content));
  return readProblem(join(home, "problem.json"));
}

function dense({ rows, cols, row, col, value }: Triplets): number[][] {
  const a = Array.from({ length: rows }, () => new Array<number>(cols).fill(0));
  for (let t = 0; t < value.length; t++) a[row[t]!]![col[t]!]! += value[t]!;
  return a;
}

const small = {
  format: "dampwright/1",
  dofs: 3,
  matrices: { M: { entries: [[1, 1, 2]] }, K: { links: [[1, 2, 5]] } },
  terms: { mass: [{ matrix: "M" }], stiffness: [{ matrix: "K" }] },
};
const symmetric4 = "%%MatrixMarket matrix coordinate real symmetric\n4 4 4\n1 1 2\n2 2 2\n3 3 2\n4 4 2\n";

describe("a problem file", () => {
  it("of the smallest kind gets every default", async () => {
    const problem = await read(small);
    expect(problem.title).toBe("problem");
    expect(problem.notes).toBeNull();
    expect(problem.dofs).toBe(3);
    expect(problem.fixed).toEqual(new Int32Array(0));
    expect(problem.margin).toEqual({
      measure: "decay",
      as: "ratio",
      terms: null,
      bandHz: null,
      target: null,
    });
    expect(problem.tune).toEqual({ seed: 1, tolerance: 0.001 });
    expect(problem.terms.map(({ group, name, pointer }) => [group, name, pointer])).toEqual([
      ["mass", "M", "/terms/mass/0"],
      ["stiffness", "K", "/terms/stiffness/0"],
    ]);
    expect(problem.terms[0]!.factor.evaluate(new Map())).toBe(1);
  });

  it("like the one in the manual is read whole", async () => {
    const size = 940;
    const file = (symmetry: string) =>
      `%%MatrixMarket matrix coordinate real ${symmetry}\n${size} ${size} 1\n2 1 3\n`;
    const problem = await read(
      {
        $schema: "./problem.schema.json",
        format: "dampwright/1",
        title: "Slewing ring brake",
        notes: "second sample",
        fixed: [7, 3],
        matrices: {
          Mring: { file: "m.mtx" },
          Gring: { file: "g.mtx.gz" },
          tail: {
            links: [
              [812, 940, 1.0],
              [813, 0, 1.0],
            ],
          },
          rub: { outer: { left: [[31, 1.0]], right: [[33, 2.0]] } },
        },
        constants: { density: 1500 },
        envelope: {
          friction: { range: [0.2, 0.6] },
          speed: { range: [2, 40], nominal: 10, unit: "rad/s" },
        },
        design: {
          tailRate: { range: [0, 800], start: 50, unit: "N s/m" },
          layer: { range: [0, 0.008], start: 0.002, step: 0.0005 },
        },
        terms: {
          mass: [{ matrix: "Mring", factor: "density*layer" }],
          damping: [{ matrix: "tail", factor: "tailRate", name: "tail dashpot", validToHz: "density/2" }],
          gyroscopic: [{ matrix: "Gring", factor: "speed" }],
          stiffness: [{ matrix: "Mring", factor: 2.5 }],
          circulatory: [{ matrix: "rub", factor: "friction*1.2e8" }],
          frictional: [],
        },
        perturbations: [
          {
            name: "contact",
            acts: "stiffness",
            left: "rub.left",
            right: "rub.right",
            size: 2.4e7,
            kind: "real",
          },
        ],
        margin: { measure: "radius", bandHz: [200, 2000], target: 1.0 },
        budget: { cost: { formula: "40*layer/0.001 + 0.2*tailRate", limit: 400, unit: "EUR" } },
        tune: { seed: 4, tolerance: 0.01 },
      },
      { "m.mtx": file("symmetric"), "g.mtx.gz": gzipSync(file("skew-symmetric")) },
    );
    expect(problem.dofs).toBe(size);
    expect([...problem.fixed]).toEqual([2, 6]);
    expect(problem.terms.map(({ validToHz }) => validToHz)).toEqual([null, 750, null, null, null]);
    expect(problem.envelope).toEqual([
      { name: "friction", low: 0.2, high: 0.6, nominal: 0.4, unit: "" },
      { name: "speed", low: 2, high: 40, nominal: 10, unit: "rad/s" },
    ]);
    expect(problem.design[1]).toEqual({
      name: "layer",
      low: 0,
      high: 0.008,
      start: 0.002,
      step: 0.0005,
      unit: "",
    });
    expect(problem.terms.map(({ name }) => name)).toEqual(["Mring", "tail dashpot", "Gring", "Mring", "rub"]);
    expect(problem.terms[3]!.factor.evaluate(new Map())).toBe(2.5);
    expect(
      problem.budget[0]!.formula.derivative(
        "layer",
        new Map([
          ["layer", 1],
          ["tailRate", 0],
        ]),
      ),
    ).toBe(40_000);
    const rub = problem.matrices.get("rub")!;
    expect(rub.triplets).toMatchObject({
      row: Int32Array.of(30),
      col: Int32Array.of(32),
      value: Float64Array.of(2),
    });
    expect(rub.left).toMatchObject({ rows: size, cols: 1, row: Int32Array.of(30) });
    expect(problem.perturbations[0]!.left).toMatchObject({ rows: size, cols: 1, row: Int32Array.of(30) });
    expect(problem.perturbations[0]!.right).toMatchObject({ rows: 1, cols: size, col: Int32Array.of(32) });
    expect(problem.inputs.map(({ path }) => path)).toEqual(["problem.json", "m.mtx", "g.mtx.gz"]);
    expect(problem.tune).toEqual({ seed: 4, tolerance: 0.01 });
  });

  it("builds links, entries and outer products as their formulas say", async () => {
    const problem = await read({
      ...small,
      matrices: {
        ...small.matrices,
        link: {
          links: [
            [1, 3, 2],
            [2, 0, 7],
            [0, 1, 1],
          ],
        },
        entry: {
          entries: [
            [1, 2, 4],
            [1, 2, 1],
          ],
          rows: 1,
          cols: 2,
        },
        many: {
          outer: {
            left: {
              columns: [
                [
                  [1, 1],
                  [2, 2],
                ],
                [[3, 1]],
              ],
            },
            right: {
              columns: [
                [[1, 3]],
                [
                  [2, 4],
                  [3, 5],
                ],
              ],
            },
          },
        },
      },
    });
    expect(dense(problem.matrices.get("link")!.triplets)).toEqual([
      [3, 0, -2],
      [0, 7, 0],
      [-2, 0, 2],
    ]);
    expect(dense(problem.matrices.get("entry")!.triplets)).toEqual([[0, 5]]);
    const many = problem.matrices.get("many")!;
    expect(dense(many.triplets)).toEqual([
      [3, 0, 0],
      [6, 0, 0],
      [0, 4, 5],
    ]);
    // left·rightᵀ, multiplied here by hand.
    const [left, right] = [dense(many.left!), dense(many.right!)];
    expect(left.map((a) => right.map((b) => a[0]! * b[0]! + a[1]! * b[1]!))).toEqual(dense(many.triplets));
  });

  it("takes the sides of a perturbation in every form", async () => {
    const outer = {
      outer: { left: { columns: [[[1, 1]], [[2, 2]]] }, right: { columns: [[[3, 3]], [[1, 4]]] } },
    };
    const B = { entries: [[1, 1, 6]], cols: 2 };
    const C = { entries: [[2, 3, 7]], rows: 2 };
    const block = (left: unknown, right: unknown) => ({ acts: "stiffness", kind: "complex", left, right });
    const { perturbations } = await read({
      ...small,
      matrices: { ...small.matrices, outer, B, C },
      perturbations: [
        block("identity", "identity"),
        block([[2, 5]], [[3, 6]]),
        block({ columns: [[[1, 1]], [[2, 1]]] }, { rows: [[[1, 1]], [[3, 1]]] }),
        block("B", "C"),
        block("outer.left", "outer.right"),
        block("outer.right", "outer.left"),
        block("K", "outer"),
      ],
    });
    const sides = perturbations.map(({ left, right }) => [left && dense(left), right && dense(right)]);
    const transposed = (a: number[][]) => a[0]!.map((_, j) => a.map((row) => row[j]!));
    const [outerLeft, outerRight] = [
      [
        [1, 0],
        [0, 2],
        [0, 0],
      ],
      [
        [0, 4],
        [0, 0],
        [3, 0],
      ],
    ];
    const K = [
      [5, -5, 0],
      [-5, 5, 0],
      [0, 0, 0],
    ];
    expect(sides).toEqual([
      [null, null],
      [[[0], [5], [0]], [[0, 0, 6]]],
      [
        [
          [1, 0],
          [0, 1],
          [0, 0],
        ],
        [
          [1, 0, 0],
          [0, 0, 1],
        ],
      ],
      [
        [
          [6, 0],
          [0, 0],
          [0, 0],
        ],
        [
          [0, 0, 0],
          [0, 0, 7],
        ],
      ],
      [outerLeft, transposed(outerRight)],
      [outerRight, transposed(outerLeft)],
      [
        K,
        [
          [0, 0, 3],
          [8, 0, 0],
          [0, 0, 0],
        ],
      ],
    ]);
    expect(perturbations.map(({ name }) => name)[6]).toBe("perturbation 7");
  });

  it("leads with the radius when errors are declared, else the multiplier when something feeds", async () => {
    const fed = { ...small, terms: { ...small.terms, frictional: [{ matrix: "M", factor: -1 }] } };
    expect((await read(fed)).margin.measure).toBe("multiplier");
    const perturbed = {
      ...fed,
      perturbations: [{ acts: "damping", kind: "symmetric", left: "K", right: "K" }],
    };
    expect((await read(perturbed)).margin.measure).toBe("radius");
  });

  it("records each file once, with digest and size, in folders below too", async () => {
    const home = join(folder, "hashed");
    mkdirSync(join(home, "below"), { recursive: true });
    writeFileSync(join(home, "below", "k.mtx"), symmetric4);
    symlinkSync(join("below", "k.mtx"), join(home, "link.mtx"));
    const matrices = {
      A: { file: "below/k.mtx" },
      B: { file: "./below/../below/k.mtx" },
      C: { file: "link.mtx" },
    };
    const content = { format: "dampwright/1", matrices, terms: { mass: [{ matrix: "C" }] } };
    writeFileSync(join(home, "x.json"), `\uFEFF${JSON.stringify(content)}`);
    const { inputs, dofs, matrices: read } = await readProblem(join(home, "x.json"));
    expect(dofs).toBe(4);
    expect(read.get("B")!.triplets.value).toEqual(read.get("C")!.triplets.value);
    const digest = (path: string) => createHash("sha256").update(readFileSync(path)).digest("hex");
    expect(inputs).toEqual([
      {
        path: "x.json",
        sha256: digest(join(home, "x.json")),
        bytes: readFileSync(join(home, "x.json")).length,
      },
      { path: "below/k.mtx", sha256: digest(join(home, "below/k.mtx")), bytes: symmetric4.length },
    ]);
    // The folder itself may be reached by a link.
    symlinkSync(home, join(folder, "elsewhere"));
    expect((await readProblem(join(folder, "elsewhere", "x.json"))).dofs).toBe(4);
    cpSync(home, join(folder, "copy"), { recursive: true, verbatimSymlinks: true });
    expect((await readProblem(join(folder, "copy", "x.json"))).inputs).toEqual(inputs);
  });

  it("accepts symmetry to rounding and skew matrices that are stored in full", async () => {
    const problem = await read({
      ...small,
      matrices: {
        ...small.matrices,
        S: {
          entries: [
            [1, 2, 1e6],
            [2, 1, 1e6 + 1e-5],
          ],
        },
        G: {
          entries: [
            [1, 2, 3],
            [2, 1, -3],
          ],
        },
      },
      terms: { stiffness: [{ matrix: "S" }], gyroscopic: [{ matrix: "G" }] },
    });
    expect(problem.terms).toHaveLength(2);
  });
});
