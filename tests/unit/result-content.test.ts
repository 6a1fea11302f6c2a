import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, it } from "vitest";
import { readProblem } from "../../src/problem/read-problem.js";
import { checkProblem } from "../../src/tuning/check-problem.js";
import { computeMargin } from "../../src/tuning/commands.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-result-"));
afterAll(() => rmSync(folder, { recursive: true }));

const silent = { version: "1", progress: () => undefined, snapshot: () => undefined };

/** One mass on a spring that resonates at 10 rad/s = 1.5915 Hz, with two dashpots of the given validity. */
async function problemOf(validToHz: string | number, layer: number) {
  const path = join(folder, "problem.json");
  const content = {
    format: "dampwright/1",
    dofs: 1,
    matrices: { unit: { entries: [[1, 1, 1]] } },
    constants: { lossHz: 1.5 },
    design: { layer: { range: [0, 1], start: layer, unit: "m" } },
    envelope: { load: { range: [1, 1] } },
    terms: {
      mass: [{ matrix: "unit" }],
      damping: [
        { matrix: "unit", factor: 0.1, name: "background", validToHz: 1e3 },
        { matrix: "unit", factor: "layer", name: "loss", validToHz },
      ],
      stiffness: [{ matrix: "unit", factor: "100*load" }],
    },
    margin: { measure: "decay", as: "rate" },
  };
  writeFileSync(path, JSON.stringify(content));
  return readProblem(path);
}

const warnings = async (validToHz: string | number, layer: number) =>
  (await computeMargin(await problemOf(validToHz, layer), {}, silent)).result.warnings;

describe("a factor that holds up to a frequency only", () => {
  it("is warned of with both frequencies when the answer lies above", async () => {
    const [warning, ...rest] = await warnings("lossHz", 0.1);
    expect(rest).toEqual([]);
    expect(warning).toContain('"loss" holds up to 1.5 Hz only: outside its validity');
    // √(100 − 0.1²) rad/s in Hz, six digits.
    expect(warning).toContain("at 1.59147 Hz");
  });

  it("is passed over where it holds", async () => {
    expect(await warnings("2*lossHz", 0.1)).toEqual([]);
  });

  it("is passed over where it is zero", async () => {
    expect(await warnings("lossHz", 0)).toEqual([]);
  });
});

it("results carry the units of design variables and operating parameters", async () => {
  const problem = await problemOf(1, 0.1);
  const units = { layer: "m", load: "" };
  expect((await computeMargin(problem, {}, silent)).result.units).toEqual(units);
  expect(checkProblem(problem, { version: "1" }, silent.progress).units).toEqual(units);
});
