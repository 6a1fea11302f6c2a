import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { gzipSync } from "node:zlib";
import { afterAll, describe, expect, it } from "vitest";
import { InputError } from "../../src/errors.js";
import { readMatrixMarket } from "../../src/problem/matrix-market.js";
import { MatrixMarketParser } from "../../src/problem/matrix-market-parser.js";
import { writeMatrixMarket } from "../../src/problem/matrix-market-writer.js";
import type { Triplets } from "../../src/problem/problem.js";
import { writeAside } from "../../src/problem/write-aside.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-mm-"));
afterAll(() => rmSync(folder, { recursive: true }));

function random(seed: number): () => number {
  let state = seed;
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 32;
  };
}

/** Parses text cut into pieces of `size` bytes. */
function parse(text: string, size = 1 << 20) {
  const parser = new MatrixMarketParser("a.mtx");
  const bytes = Buffer.from(text);
  for (let at = 0; at < bytes.length; at += size) parser.feed(bytes.subarray(at, at + size));
  return parser.finish();
}

/** Row-major dense rows, duplicates added. */
function dense({ rows, cols, row, col, value }: Triplets): number[][] {
  const a = Array.from({ length: rows }, () => new Array<number>(cols).fill(0));
  for (let t = 0; t < value.length; t++) a[row[t]!]![col[t]!]! += value[t]!;
  return a;
}

function faultOf(text: string): { code: string; at: string } {
  try {
    parse(text);
  } catch (error) {
    if (error instanceof InputError) return { code: error.faults[0]!.code, at: error.faults[0]!.at };
    throw error;
  }
  return { code: "none", at: "" };
}

const real = "%%MatrixMarket matrix coordinate real general\n";

describe("the Matrix Market reader", () => {
  it("reads coordinates with comments, blank lines, carriage returns and either case", () => {
    const text =
      "%%matrixmarket MATRIX Coordinate REAL General\r\n% note\r\n\r\n 2  3 2\r\n%x\r\n1 3\t-2.5e1 \r\n\r\n2 1 .5";
    expect(dense(parse(text))).toEqual([
      [0, 0, -25],
      [0.5, 0, 0],
    ]);
  });

  it("keeps duplicates, to be added later", () => {
    const a = parse(`${real}1 1 2\n1 1 2\n1 1 3\n`);
    expect([...a.value]).toEqual([2, 3]);
  });

  it("expands symmetric and skew-symmetric files", () => {
    expect(dense(parse("%%MatrixMarket matrix coordinate real symmetric\n2 2 2\n1 1 4\n2 1 3\n"))).toEqual([
      [4, 3],
      [3, 0],
    ]);
    expect(dense(parse("%%MatrixMarket matrix coordinate integer skew-symmetric\n2 2 1\n2 1 3\n"))).toEqual([
      [0, -3],
      [3, 0],
    ]);
  });

  it("reads arrays by columns, of symmetric ones the lower triangle", () => {
    expect(dense(parse("%%MatrixMarket matrix array real general\n2 2\n1\n2\n3\n4\n"))).toEqual([
      [1, 3],
      [2, 4],
    ]);
    expect(dense(parse("%%MatrixMarket matrix array real symmetric\n3 3\n1\n2\n3\n4\n5\n6\n"))).toEqual([
      [1, 2, 3],
      [2, 4, 5],
      [3, 5, 6],
    ]);
    expect(dense(parse("%%MatrixMarket matrix array real skew-symmetric\n3 3\n1\n2\n3\n"))).toEqual([
      [0, -1, -2],
      [1, 0, -3],
      [2, 3, 0],
    ]);
  });

  it("takes entries of pattern files as 1", () => {
    const a = parse("%%MatrixMarket matrix coordinate pattern symmetric\n2 2 1\n2 1\n");
    expect(dense(a)).toEqual([
      [0, 1],
      [1, 0],
    ]);
  });

  it("gives the same matrix however the bytes are cut", () => {
    const text = `${real}% c\n3 3 4\n1 1 1.25\n2 2 -3e-3\n3 3 12345.678901234567\n1 3 7`;
    const whole = dense(parse(text));
    for (let size = 1; size < text.length; size++) expect(dense(parse(text, size))).toEqual(whole);
  });

  it("rounds every decimal as the language does, bit for bit", () => {
    const next = random(7);
    const hard = [
      "9007199254740993",
      "1e23",
      "8.5e-23",
      "1e-400",
      "4.9e-324",
      "0.1",
      "-0",
      "00012.50",
      "1.7976931348623157e308",
    ];
    const words = Array.from({ length: 3000 }, (_, k) => {
      const x = (next() - 0.5) * 10 ** (60 * next() - 30);
      return [String(x), x.toExponential(16), x.toPrecision(9), x.toExponential(20)][k % 4]!;
    }).concat(hard);
    const a = parse(`${real}1 1 ${words.length}\n${words.map((w) => `1 1 ${w}\n`).join("")}`);
    words.forEach((word, t) => {
      expect(Object.is(a.value[t], Number(word)), word).toBe(true);
    });
  });

  it("reads exponents written with D", () => {
    expect(parse(`${real}1 1 2\n1 1 1.5D+02\n1 1 1.234567890123456789d1\n`).value).toEqual(
      Float64Array.of(150, 12.345678901234567),
    );
  });

  const coordinate = (size: string, entries: string) => `${real}${size}\n${entries}`;
  it.each([
    ["an empty file", "", "input.matrix-header", 1],
    ["another format", "hello\n", "input.matrix-header", 1],
    ["vectors", "%%MatrixMarket vector coordinate real general\n", "input.matrix-header", 1],
    ["complex entries", "%%MatrixMarket matrix coordinate complex general\n", "input.matrix-field", 1],
    ["hermitian matrices", "%%MatrixMarket matrix coordinate real hermitian\n", "input.matrix-field", 1],
    ["pattern arrays", "%%MatrixMarket matrix array pattern general\n", "input.matrix-header", 1],
    ["a missing line of sizes", real, "input.matrix-size", 1],
    ["a wrong line of sizes", coordinate("2 2", ""), "input.matrix-size", 2],
    ["sizes that are no numbers", coordinate("2 x 1", ""), "input.matrix-size", 2],
    ["sizes of 0", coordinate("0 2 0", ""), "input.matrix-size", 2],
    ["sizes above 2^31", coordinate("3000000000 2 1", ""), "input.matrix-size", 2],
    ["more than 5e8 entries", coordinate("9 9 600000000", ""), "input.matrix-size", 2],
    ["huge arrays", "%%MatrixMarket matrix array real general\n100000 100000\n", "input.matrix-size", 2],
    [
      "rectangular symmetric matrices",
      "%%MatrixMarket matrix coordinate real symmetric\n2 3 0\n",
      "input.matrix-size",
      2,
    ],
    ["too few entries", coordinate("2 2 2", "1 1 1\n"), "input.matrix-count", 3],
    ["too many entries", coordinate("2 2 1", "1 1 1\n1 1 1\n"), "input.matrix-count", 4],
    ["row 0", coordinate("2 2 1", "0 1 1\n"), "input.matrix-index", 3],
    ["a column too many", coordinate("2 2 1", "1 3 1\n"), "input.matrix-index", 3],
    ["an index of many digits", coordinate("2 2 1", "1 99999999999999999999 1\n"), "input.matrix-index", 3],
    ["a missing value", coordinate("2 2 1", "1 1\n"), "input.matrix-entry", 3],
    ["a missing column", coordinate("2 2 1", "1\n"), "input.matrix-entry", 3],
    ["a negative index", coordinate("2 2 1", "-1 1 1\n"), "input.matrix-entry", 3],
    ["a fractional index", coordinate("2 2 1", "1.5 1 1\n"), "input.matrix-entry", 3],
    ["two numbers too many", coordinate("2 2 1", "1 1 1 7\n"), "input.matrix-entry", 3],
    ["a word", coordinate("2 2 1", "1 1 x\n"), "input.matrix-entry", 3],
    ["two points", coordinate("2 2 1", "1 1 1.2.3\n"), "input.matrix-entry", 3],
    ["an exponent without digits", coordinate("2 2 1", "1 1 1e+\n"), "input.matrix-entry", 3],
    ["a lone sign", coordinate("2 2 1", "1 1 -\n"), "input.matrix-entry", 3],
    ["nan", coordinate("2 2 1", "1 1 NaN\n"), "input.matrix-non-finite", 3],
    ["infinity", coordinate("2 2 1", "1 1 -inf\n"), "input.matrix-non-finite", 3],
    ["overflow", coordinate("2 2 1", "1 1 1e999\n"), "input.matrix-non-finite", 3],
    [
      "fractions in integer files",
      "%%MatrixMarket matrix coordinate integer general\n1 1 1\n1 1 1.5\n",
      "input.matrix-entry",
      3,
    ],
    [
      "the upper triangle",
      "%%MatrixMarket matrix coordinate real symmetric\n2 2 1\n1 2 1\n",
      "input.matrix-triangle",
      3,
    ],
    [
      "a skew diagonal",
      "%%MatrixMarket matrix coordinate real skew-symmetric\n2 2 1\n1 1 1\n",
      "input.matrix-diagonal",
      3,
    ],
    ["endless lines", `${real}${" ".repeat(70000)}`, "input.matrix-line", 2],
  ])("refuses %s with its line", (_, text, code, line) => {
    expect(faultOf(text)).toEqual({ code, at: `a.mtx:${line}` });
  });

  it("does not trust a declared count with memory", () => {
    const before = process.memoryUsage().arrayBuffers;
    expect(faultOf(coordinate("9 9 400000000", "1 1 1\n")).code).toBe("input.matrix-count");
    // Trusting it would take 6.4 GB.
    expect(process.memoryUsage().arrayBuffers - before).toBeLessThan(1e8);
  });

  it("reads gzip by content, with the digest of the bytes on disk", async () => {
    const text = `${real}1 1 1\n1 1 5\n`;
    writeFileSync(join(folder, "zipped.mtx"), gzipSync(text));
    const a = await readMatrixMarket(join(folder, "zipped.mtx"));
    expect([...a.value]).toEqual([5]);
    expect(a.bytes).toBe(gzipSync(text).length);
    expect(a.sha256).toMatch(/^[0-9a-f]{64}$/);
  });

  it("refuses damaged gzip, missing files and folders", async () => {
    writeFileSync(join(folder, "cut.mtx.gz"), gzipSync(real.repeat(50)).subarray(0, 40));
    const codeOf = (path: string) => readMatrixMarket(join(folder, path)).catch((e: InputError) => e.code);
    expect(await codeOf("cut.mtx.gz")).toBe("input.matrix-gzip");
    expect(await codeOf("none.mtx")).toBe("input.file-missing");
    expect(await codeOf(".")).toBe("input.file-unreadable");
  });
});

describe("the Matrix Market writer", () => {
  /** Random entries, mirrored with a sign unless that is 0. */
  function matrix(seed: number, sign: number): Triplets {
    const next = random(seed);
    const entries = Array.from({ length: 20_000 }, () => {
      const i = Math.floor(next() * 300);
      const j = Math.floor(next() * 300);
      return {
        i,
        j: sign === -1 && i === j ? (i + 1) % 300 : j,
        x: (next() - 0.5) * 10 ** (40 * next() - 20),
      };
    });
    if (sign !== 0) entries.push(...entries.map(({ i, j, x }) => ({ i: j, j: i, x: sign * x })));
    return {
      rows: 300,
      cols: 300,
      row: Int32Array.from(entries, (e) => e.i),
      col: Int32Array.from(entries, (e) => e.j),
      value: Float64Array.from(entries, (e) => e.x),
    };
  }

  it.each([
    ["general", 0, "a.mtx"],
    ["general", 0, "b.mtx.gz"],
    ["symmetric", 1, "c.mtx"],
    ["skew-symmetric", -1, "d.mtx.gz"],
  ] as const)("and the reader return a %s matrix unchanged (%s, %s)", async (symmetry, sign, name) => {
    const a = matrix(3, sign);
    const path = join(folder, name);
    await writeMatrixMarket(path, a, symmetry);
    const b = await readMatrixMarket(path);
    expect(b.symmetry).toBe(symmetry);
    expect(readFileSync(path)[0]).toBe(name.endsWith(".gz") ? 0x1f : 37);
    const [before, after] = [dense(a), dense(b)];
    // Exactly: duplicates of the lower triangle are added in their old order, the upper triangle mirrors it.
    const triangle = (rows: number[][]) => rows.map((row, i) => row.slice(0, i + 1));
    expect(triangle(after)).toEqual(triangle(before));
    if (sign !== 0) expect(after.map((_, j) => after.map((row) => sign * row[j]! + 0))).toEqual(after);
    if (sign === 0) expect(b.value).toEqual(a.value);
  });

  it("keeps the sign of zero and the ends of the range", async () => {
    const value = Float64Array.of(-0, 0, 5e-324, -1.7976931348623157e308, 1 / 3, 1e21);
    const place = new Int32Array(6);
    await writeMatrixMarket(join(folder, "f.mtx"), { rows: 1, cols: 1, row: place, col: place, value });
    expect((await readMatrixMarket(join(folder, "f.mtx"))).value).toEqual(value);
  });

  it("will not write an unsymmetric matrix as symmetric", async () => {
    await expect(writeMatrixMarket(join(folder, "e.mtx"), matrix(4, 0), "symmetric")).rejects.toThrow(
      "invariant",
    );
    expect(readdirSync(folder).filter((name) => name.includes("e.mtx"))).toEqual([]);
  });

  it("leaves nothing behind and the old file whole when it fails", async () => {
    const path = join(folder, "kept.mtx.gz");
    writeFileSync(path, "old");
    const bad = {
      ...matrix(5, 0),
      value: new Float64Array(20_000).fill(1, 0, 15_000).fill(Number.NaN, 15_000),
    };
    await expect(writeMatrixMarket(path, bad)).rejects.toThrow("finite");
    expect(readFileSync(path, "utf8")).toBe("old");
    expect(readdirSync(folder).filter((name) => name.endsWith(".part"))).toEqual([]);
  });

  it("says so when the folder does not exist", async () => {
    const error = await writeAside(join(folder, "none", "x"), ["a"]).catch((e: unknown) => e);
    expect(error).toBeInstanceOf(InputError);
    expect((error as InputError).code).toBe("output.unwritable");
  });
});
