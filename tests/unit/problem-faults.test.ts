import { mkdirSync, mkdtempSync, rmSync, symlinkSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, it } from "vitest";
import { type Fault, InputError } from "../../src/errors.js";
import { readProblem } from "../../src/problem/read-problem.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-faults-"));
afterAll(() => rmSync(folder, { recursive: true }));
const header = "%%MatrixMarket matrix coordinate real";
writeFileSync(join(folder, "square4.mtx"), `${header} general\n4 4 1\n1 1 1\n`);
writeFileSync(join(folder, "wide.mtx"), `${header} general\n2 3 1\n1 1 1\n`);
writeFileSync(join(folder, "bad.mtx"), `${header} general\n3 3 1\n1 9 1\n`);
writeFileSync(join(folder, "vast.mtx"), `${header} symmetric\n2000000000 2000000000 1\n1 1 1\n`);
mkdirSync(join(folder, "sub"));
const outside = mkdtempSync(join(tmpdir(), "dampwright-outside-"));
afterAll(() => rmSync(outside, { recursive: true }));
writeFileSync(join(outside, "secret.mtx"), `${header} general\n3 3 1\n1 1 1\n`);
symlinkSync(join(outside, "secret.mtx"), join(folder, "escape.mtx"));
symlinkSync(outside, join(folder, "away"));

const path = join(folder, "problem.json");
async function faultsOf(content: object | string | Buffer): Promise<readonly Fault[]> {
  writeFileSync(
    path,
    typeof content === "string" || Buffer.isBuffer(content) ? content : JSON.stringify(content),
  );
  try {
    await readProblem(path);
  } catch (error) {
    if (error instanceof InputError) return error.faults;
    throw error;
  }
  return [];
}
/** "code pointer" of each fault. */
async function placesOf(content: object | string | Buffer): Promise<string[]> {
  return (await faultsOf(content)).map(
    ({ code, at }) => `${code}${at.replace(path, "").replace(folder, "")}`,
  );
}

const base = {
  format: "dampwright/1",
  dofs: 3,
  matrices: { M: { entries: [[1, 1, 2]] }, K: { links: [[1, 2, 5]] } },
  terms: { mass: [{ matrix: "M" }], stiffness: [{ matrix: "K" }] },
};
const withMatrix = (X: object) => ({ ...base, matrices: { ...base.matrices, X } });
const withFile = (file: string) => withMatrix({ file });
const withTerm = (term: object, group = "damping") => ({
  ...base,
  terms: { ...base.terms, [group]: [term] },
});
const withBlock = (block: object) => ({
  ...base,
  perturbations: [{ acts: "stiffness", kind: "complex", left: "identity", right: "identity", ...block }],
});
const factor = (text: unknown, more: object = {}) => ({
  ...withTerm({ matrix: "K", factor: text }),
  ...more,
});
const withValidity = (validToHz: unknown) => ({
  ...withTerm({ matrix: "K", validToHz }),
  design: { a: { range: [0, 1], start: 1 } },
});
const at = "input.";

describe("one fault of a problem file is told with code and place:", () => {
  const cases: [string, object | string | Buffer, string][] = [
    ["another format", { ...base, format: "dampwright/9" }, "format /format"],
    ["a missing key", { format: base.format, terms: {}, dofs: 1 }, "missing-key"],
    ["an unknown key", { ...base, titel: "x" }, "unknown-key /titel"],
    [
      "an unknown group of terms",
      { ...base, terms: { ...base.terms, massive: [] } },
      "unknown-key /terms/massive",
    ],
    ["an unknown key of a matrix", withMatrix({ links: [], rate: 3 }), "unknown-key /matrices/X/rate"],
    ["a wrong type", { ...base, dofs: "3" }, "type /dofs"],
    ["a matrix of no known form", withMatrix({ fil: "a.mtx" }), "type /matrices/X"],
    ["a list of wrong length", withMatrix({ links: [[1, 2]] }), "value /matrices/X/links/0"],
    ["a value out of range", { ...base, tune: { tolerance: 0 } }, "value /tune/tolerance"],
    [
      "an infinite number",
      JSON.stringify(base).replace('"dofs":3', '"dofs":3,"constants":{"a":1e999}'),
      "type /constants/a",
    ],
    ["a word not in the list", { ...base, margin: { measure: "radus" } }, "value /margin/measure"],
    ["a name with a dash", { ...base, constants: { "a-b": 1 } }, "name /constants/a-b"],
    ["the name pi", { ...base, constants: { pi: 3 } }, "name /constants/pi"],
    ["the name sqrt", { ...base, design: { sqrt: { range: [0, 1], start: 0 } } }, "name /design/sqrt"],
    ["the name constructor", { ...base, constants: { constructor: 3 } }, "name /constants/constructor"],
    [
      "the name toString of a matrix",
      { ...base, matrices: { ...base.matrices, toString: { links: [] } } },
      "name /matrices/toString",
    ],
    [
      "the name valueOf of a limit",
      { ...base, budget: { valueOf: { formula: 1, limit: 2 } } },
      "name /budget/valueOf",
    ],
    [
      "the matrix name identity",
      { ...base, matrices: { ...base.matrices, identity: { links: [] } } },
      "name /matrices/identity",
    ],
    [
      "the name __proto__",
      JSON.stringify(base).replace('"dofs":3', '"dofs":3,"constants":{"__proto__":1}'),
      "name /constants/__proto__",
    ],
    [
      "one name in two blocks",
      { ...base, constants: { a: 1 }, design: { a: { range: [0, 1], start: 0 } } },
      "duplicate-name /design/a",
    ],
    [
      "a key that stands twice",
      JSON.stringify(base).replace('"dofs":3', '"dofs":3,"dofs":4'),
      "duplicate-key /dofs",
    ],
    ["a range upside down", { ...base, design: { a: { range: [1, 0], start: 0 } } }, "range /design/a/range"],
    ["a start outside", { ...base, design: { a: { range: [0, 1], start: 2 } } }, "range /design/a/start"],
    [
      "a nominal value outside",
      { ...base, envelope: { a: { range: [0, 1], nominal: -1 } } },
      "range /envelope/a/nominal",
    ],
    ["a step of 0", { ...base, design: { a: { range: [0, 1], start: 0, step: 0 } } }, "value /design/a/step"],
    ["missing dofs", { ...base, dofs: undefined }, "dofs-missing"],
    ["a dof of 0", withMatrix({ entries: [[0, 1, 1]] }), "value /matrices/X/entries/0/0"],
    ["a link to a dof too many", withMatrix({ links: [[4, 0, 1]] }), "dof-range /matrices/X/links/0/0"],
    ["a link to itself", withMatrix({ links: [[2, 2, 1]] }), "link /matrices/X/links/0"],
    ["an entry outside", withMatrix({ entries: [[1, 4, 1]] }), "dof-range /matrices/X/entries/0"],
    [
      "a vector outside",
      withMatrix({ outer: { left: [[4, 1]], right: [[1, 1]] } }),
      "dof-range /matrices/X/outer/left/0/0",
    ],
    [
      "an outer product of unequal sides",
      withMatrix({ outer: { left: [[1, 1]], right: { columns: [[[1, 1]], [[2, 1]]] } } }),
      "matrix-shape /matrices/X/outer",
    ],
    ["a fixed dof too many", { ...base, fixed: [4] }, "dof-range /fixed/0"],
    ["a dof fixed twice", { ...base, fixed: [1, 1] }, "fixed /fixed/1"],
    ["all dofs fixed", { ...base, fixed: [1, 2, 3] }, "fixed /fixed"],
    ["no terms", { ...base, terms: { mass: [] } }, "no-terms /terms"],
    ["an unknown matrix", withTerm({ matrix: "KK" }), "unknown-matrix /terms/damping/0/matrix"],
    [
      "a matrix of another size",
      { ...withFile("square4.mtx"), terms: { mass: [{ matrix: "X" }] } },
      "matrix-shape /terms/mass/0/matrix",
    ],
    [
      "a rectangular matrix in a term",
      { ...withFile("wide.mtx"), terms: { circulatory: [{ matrix: "X" }] } },
      "matrix-shape /terms/circulatory/0/matrix",
    ],
    [
      "an unsymmetric damping",
      { ...withMatrix({ entries: [[1, 2, 3]] }), terms: { damping: [{ matrix: "X" }] } },
      "not-symmetric /terms/damping/0/matrix",
    ],
    [
      "a gyroscopic matrix with a diagonal",
      { ...base, terms: { gyroscopic: [{ matrix: "M" }] } },
      "not-skew /terms/gyroscopic/0/matrix",
    ],
    [
      "a symmetric matrix as gyroscopic",
      { ...base, terms: { gyroscopic: [{ matrix: "K" }] } },
      "not-skew /terms/gyroscopic/0/matrix",
    ],
    ["a missing file", withFile("squar4.mtx"), "file-missing /matrices/X/file"],
    ["a folder for a file", withFile("sub"), "file-unreadable /matrices/X/file"],
    ["a file above", withFile("../x.mtx"), "file-outside /matrices/X/file"],
    ["an absolute file elsewhere", withFile("/etc/hostname"), "file-outside /matrices/X/file"],
    ["a link out of the folder", withFile("escape.mtx"), "file-outside /matrices/X/file"],
    ["a linked folder outside", withFile("away/secret.mtx"), "file-outside /matrices/X/file"],
    ["the folder itself", withFile("."), "file-outside /matrices/X/file"],
    ["a vast matrix", withFile("vast.mtx"), "matrix-size /matrices/X/file"],
    ["a faulty matrix file", withFile("bad.mtx"), "matrix-index/bad.mtx:3"],
    ["a formula with an unknown name", factor("a*2"), "formula-name /terms/damping/0/factor"],
    ["a formula without a sign", factor("2 pi"), "formula-syntax /terms/damping/0/factor"],
    ["a formula that assigns", factor("a = 2"), "formula-refused /terms/damping/0/factor"],
    ["an endless formula", factor("1+".repeat(1500)), "formula-long /terms/damping/0/factor"],
    [
      "a formula undefined at the start",
      factor("1/a", { design: { a: { range: [0, 1], start: 0 } } }),
      "formula-value /terms/damping/0/factor",
    ],
    ["a validity that varies", withValidity("2*a"), "formula-name /terms/damping/0/validToHz"],
    ["a validity of nothing", withValidity("1 - 1"), "value /terms/damping/0/validToHz"],
    ["an infinite formula", factor("1e300*1e300"), "formula-value /terms/damping/0/factor"],
    [
      "operating parameters in a budget",
      { ...base, envelope: { a: { range: [0, 1] } }, budget: { b: { formula: "2*a", limit: 1 } } },
      "formula-name /budget/b/formula",
    ],
    [
      "an unknown matrix in a perturbation",
      withBlock({ left: "KM.left" }),
      "unknown-matrix /perturbations/0/left",
    ],
    [
      "a factor of a matrix that has none",
      withBlock({ right: "K.right" }),
      "matrix-form /perturbations/0/right",
    ],
    [
      "a left side of wrong height",
      { ...withBlock({ left: "X" }), ...{ matrices: { ...base.matrices, X: { file: "wide.mtx" } } } },
      "matrix-shape /perturbations/0/left",
    ],
    [
      "a right side of wrong width",
      { ...withBlock({ right: "X" }), ...{ matrices: { ...base.matrices, X: { file: "square4.mtx" } } } },
      "matrix-shape /perturbations/0/right",
    ],
    [
      "a vector of a perturbation outside",
      withBlock({ right: { rows: [[[1, 1]], [[4, 1]]] } }),
      "dof-range /perturbations/0/right/rows/1/0/0",
    ],
    ["columns on the right", withBlock({ right: { columns: [[[1, 1]]] } }), "type /perturbations/0/right"],
    [
      "a scalar of unequal sides",
      withBlock({ kind: "scalar", left: [[1, 1]] }),
      "matrix-shape /perturbations/0",
    ],
    ["a symmetric error of the stiffness", withBlock({ kind: "symmetric" }), "value /perturbations/0/acts"],
    [
      "a symmetric error of unequal sides",
      withBlock({ kind: "symmetric", acts: "damping", left: [[1, 1]], right: [[2, 1]] }),
      "matrix-shape /perturbations/0/right",
    ],
    [
      "perturbations of one name",
      { ...base, perturbations: [1, 2].map(() => ({ ...withBlock({}).perturbations[0], name: "a" })) },
      "duplicate-name /perturbations/1/name",
    ],
    ["a radius without perturbations", { ...base, margin: { measure: "radius" } }, "measure /margin/measure"],
    ["a multiplier of nothing", { ...base, margin: { measure: "multiplier" } }, "measure /margin/measure"],
    [
      "an unknown term",
      { ...base, margin: { measure: "multiplier", terms: ["L"] } },
      "unknown-term /margin/terms/0",
    ],
    [
      "a name of two terms",
      { ...base, terms: { mass: [{ matrix: "K" }], stiffness: [{ matrix: "K" }] }, margin: { terms: ["K"] } },
      "ambiguous-term /margin/terms/0",
    ],
    ["a term named twice", { ...base, margin: { terms: ["K", "K"] } }, "duplicate-name /margin/terms/1"],
    ["a band upside down", { ...base, margin: { bandHz: [10, 10] } }, "range /margin/bandHz"],
    ["a negative frequency", { ...base, margin: { bandHz: [-1, 10] } }, "value /margin/bandHz/0"],
    ["a large model without a band", { ...base, dofs: 2003, fixed: [1, 2] }, "band-missing /margin"],
    ["a name without a letter", { ...base, title: "" }, "value /title"],
    ["a label of two lines", withTerm({ matrix: "K", name: "a\nb" }), "value /terms/damping/0/name"],
    ["a list for a file", [], "type"],
    ["text that is no JSON", '{\n  "a": 1,\n}', "json-syntax"],
    [
      "bytes that are no UTF-8",
      Buffer.from(JSON.stringify({ ...base, title: "\u00e9" }), "latin1"),
      "json-syntax",
    ],
  ];
  it.each(cases)("%s", async (_, content, expected) => {
    const places = await placesOf(content);
    expect(places).toContain(at + expected);
    // Nothing else is complained about, except what is missing besides.
    if (!expected.startsWith("missing-key")) expect(places).toHaveLength(1);
  });

  it("a missing problem file and a folder", async () => {
    const code = (name: string) => readProblem(join(folder, name)).catch((error: InputError) => error.code);
    expect(await code("none.json")).toBe("input.file-missing");
    expect(await code("sub")).toBe("input.file-unreadable");
  });
});

describe("the faults of a problem file", () => {
  it("are none where the neighbours of each case are right", async () => {
    expect(await placesOf(base)).toEqual([]);
    expect(await placesOf({ ...base, dofs: 2002, fixed: [1, 2] })).toEqual([]);
    expect(
      await placesOf(withBlock({ kind: "symmetric", acts: "damping", left: [[1, 1]], right: [[1, 1]] })),
    ).toEqual([]);
    expect(await placesOf(withFile("wide.mtx"))).toEqual([]);
  });

  it("are all told at once, in schema, names, formulas, matrices and files", async () => {
    const places = await placesOf({
      ...base,
      titel: "x",
      matrices: { ...base.matrices, bad: { file: "bad.mtx" }, gone: { file: "gone.mtx" }, form: { fil: 1 } },
      constants: { density: "heavy" },
      design: { layer: { range: [0, 1], start: 3, stp: 1 } },
      terms: {
        mass: [{ matrix: "N" }, { matrix: "M", factor: "densty*layr" }, { matrx: "M" }],
        gyroscopic: [{ matrix: "K" }],
      },
      margin: { bandHz: [3, 2] },
    });
    expect(places.sort()).toEqual(
      [
        "unknown-key /titel",
        "unknown-key /design/layer/stp",
        "type /constants/density",
        "type /matrices/form",
        "missing-key /terms/mass/2",
        "unknown-key /terms/mass/2/matrx",
        "matrix-index/bad.mtx:3",
        "file-missing /matrices/gone/file",
        "range /design/layer/start",
        "unknown-matrix /terms/mass/0/matrix",
        "formula-name /terms/mass/1/factor",
        "formula-name /terms/mass/1/factor",
        "not-skew /terms/gyroscopic/0/matrix",
        "range /margin/bandHz",
      ]
        .map((place) => at + place)
        .sort(),
    );
  });

  it("do not follow from one another", async () => {
    expect(
      await placesOf({
        ...base,
        dofs: undefined,
        matrices: { ...base.matrices, K: { file: "gone.mtx" }, P: { fil: 3 } },
        design: { a: { range: [0], start: 1 } },
        terms: { mass: [{ matrix: "M", factor: "a" }], stiffness: [{ matrix: "K" }, { matrix: "P" }] },
        perturbations: [
          { acts: "stiffnes", kind: "real", left: "P", right: "K" },
          { acts: "stiffness", kind: "real", left: "P", right: "K.right" },
        ],
        margin: { measure: "radius" },
      }),
    ).toEqual(
      [
        "type /matrices/P",
        "value /design/a/range",
        "value /perturbations/0/acts",
        "file-missing /matrices/K/file",
      ].map((p) => expect.stringContaining(p)),
    );
  });

  it("of size name the term that is not square, not the others", async () => {
    const matrices = { W: { file: "wide.mtx" }, S: { file: "square4.mtx" } };
    const terms = { mass: [{ matrix: "W" }], stiffness: [{ matrix: "S" }] };
    expect(await placesOf({ ...base, dofs: undefined, matrices, terms })).toEqual([
      "input.matrix-shape /terms/mass/0/matrix",
    ]);
  });

  it("name what was probably meant", async () => {
    const hintOf = async (content: object) => (await faultsOf(content))[0]!.hint;
    expect(await hintOf({ ...base, tittle: "x" })).toContain('"title"');
    expect(await hintOf({ ...base, terms: { ...base.terms, dampin: [] } })).toContain('"damping"');
    expect(await hintOf(withTerm({ matrix: "k" }))).toContain('"K"');
    expect(await hintOf(withFile("squar4.mtx"))).toContain('"square4.mtx"');
    expect(await hintOf(factor("densty", { constants: { density: 1 } }))).toContain('"density"');
    expect(await hintOf(factor("dens", { constants: { density: 1 } }))).toContain('"density"');
    expect(await hintOf(factor("quite", { constants: { density: 1 } }))).toBe("Use one of: density, pi.");
    expect(await hintOf({ ...base, margin: { measure: "radus" } })).toContain('"radius"');
  });

  it("tell line and column of a slip in the JSON, and the worst pair of an unsymmetric matrix", async () => {
    expect((await faultsOf('{\n  "a": 1,\n}'))[0]!.message).toContain("line 3, column 1");
    const entries = [
      [1, 1, 9],
      [1, 2, 3],
      [2, 1, 3.5],
      [3, 2, 7],
      [3, 2, -2],
      [2, 3, 1],
    ];
    const [fault] = await faultsOf({
      ...base,
      matrices: { X: { entries } },
      terms: { stiffness: [{ matrix: "X" }] },
    });
    expect(fault!.message).toContain("entry (3, 2) is 5, entry (2, 3) is 1");
  });

  it("tell the values at which a formula is undefined", async () => {
    const [fault] = await faultsOf(factor("log(a)*b", { constants: { a: -2, b: 3 } }));
    expect(fault!.message).toContain("a = -2, b = 3");
  });
});
