/** The problems that come with the repository, through the built command line. */

import { readdirSync, readFileSync } from "node:fs";
import { join, resolve } from "node:path";
import { describe, expect, it } from "vitest";
import { newFolder, run, start } from "./command-line.js";

const problem = (name: string) => resolve("problems", name, `${name}.json`);

async function answer(command: "margin" | "tune", name: string) {
  const folder = newFolder();
  const { status, stdout } = await run([command, problem(name), "--json", "--quiet", "--out", "r"], folder);
  const summary = readFileSync(join(folder, "r", "summary.txt"), "utf8");
  return { status, result: JSON.parse(stdout), summary };
}

it.each(["ring-brake", "friction-oscillator", "cross-coupled-rotor"])(
  "%s is what `sample` writes",
  async (name) => {
    const folder = newFolder();
    expect((await run(["sample", name, "--out", "."], folder)).status).toBe(0);
    const kept = resolve("problems", name);
    expect(readdirSync(folder).sort()).toEqual(readdirSync(kept).sort());
    for (const file of readdirSync(kept)) {
      expect(readFileSync(join(folder, file), "utf8") === readFileSync(join(kept, file), "utf8"), file).toBe(
        true,
      );
    }
  },
);

describe("margin of", () => {
  it("the friction oscillator is the closed form in its notes, 64/75", async () => {
    const { status, result } = await answer("margin", "friction-oscillator");
    expect(status).toBe(0);
    expect(result).toMatchObject({ status: "trusted", warnings: [], margin: { loss: "flutter" } });
    expect(result.margin.value).toBeCloseTo(64 / 75, 10);
    expect(result.margin.breaksAtHz).toBeCloseTo(Math.sqrt(8 / 3) / (2 * Math.PI), 8);
    // The file's friction is above the critical one.
    expect(result.unperturbed.stable).toBe(false);
  });

  it("the cross-coupled rotor is the closed form in its notes, c √(k/m) / q", async () => {
    const { status, result } = await answer("margin", "cross-coupled-rotor");
    expect(status).toBe(0);
    expect(result).toMatchObject({ status: "trusted", warnings: [], margin: { loss: "flutter" } });
    expect(result.margin.value).toBeCloseTo((400 * Math.sqrt(4e6 / 10)) / 1e5, 9);
    expect(result.margin.breaksAtHz).toBeCloseTo(Math.sqrt(4e6 / 10) / (2 * Math.PI), 7);
    expect(result.unperturbed.stable).toBe(true);
  });

  it("the ring brake's start design is growth near 391 Hz at the highest friction", async () => {
    const { status, result, summary } = await answer("margin", "ring-brake");
    expect(status).toBe(1);
    expect(result).toMatchObject({ status: "trusted", margin: { loss: "flutter", meetsTarget: false } });
    expect(result.model.dofs).toBe(1002);
    expect(result.margin.value).toBeLessThan(0);
    // The numbers are those of an earlier run; the worst operating point is found to a thousandth of its range.
    expect(result.margin.breaksAtHz).toBeCloseTo(390.78, 1);
    expect(result.unperturbed.abscissa).toBeCloseTo(0.974, 2);
    expect(result.margin.at.friction).toBe(0.55);
    expect(result.margin.at.pressure).toBeCloseTo(0.766, 1);
    expect(result.measures.multiplier).toBeCloseTo(0.603, 2);
    // Friction feeds the vibration, and what damping does not take away makes it grow.
    const power = new Map<string, number>(
      result.balance.map((row: { name: string; power: number }) => [row.name, row.power]),
    );
    expect(power.get("rub")).toBeCloseTo(-1, 8);
    expect(power.get("stored energy")).toBeGreaterThan(0.3);
    // The README quotes the summary; its evidence and effort may move in the last digits.
    const [quoted] = summary.split("\n\n  model");
    expect(readFileSync("README.md", "utf8")).toContain(quoted);
  });
});

describe("tune of the ring brake", () => {
  it("reaches the target that the start misses, within budget and with evidence", {
    timeout: 900_000,
  }, async () => {
    const { status, result } = await answer("tune", "ring-brake");
    expect(status).toBe(0);
    expect(result).toMatchObject({ status: "trusted", doubts: [], margin: { target: 1, meetsTarget: true } });
    // An earlier run found 1.186; the tolerance of the search is a thousandth.
    expect(result.margin.value).toBeGreaterThan(1.18);
    expect(result.before.margin).toMatchObject({ meetsTarget: false });
    expect(result.before.margin.value).toBeLessThan(0);
    expect(result.effort.factorisationsBeforeAudit).toBeLessThanOrEqual(40);
    for (const { used, limit } of Object.values<{ used: number; limit: number }>(result.budget)) {
      // Limits are kept to a millionth of themselves.
      expect(used).toBeLessThanOrEqual(limit * (1 + 1e-6));
    }
    expect(result.witness.residual).toBeLessThan(1e-8);
    for (const { value } of result.audit.envelope) {
      expect(value).toBeGreaterThanOrEqual(result.margin.value - 1e-6);
    }
  });

  it("interrupted while it searches leaves a provisional design", async () => {
    const folder = newFolder();
    const { child, ended } = start(["tune", problem("ring-brake"), "--out", "t"], folder);
    child.stderr?.on("data", (text) => {
      if (String(text).includes("screening")) child.kill("SIGINT");
    });
    const { status, stdout } = await ended;
    expect(status).toBe(130);
    expect(stdout).toContain("INTERRUPTED: the best so far");
    const result = JSON.parse(readFileSync(join(folder, "t", "result.json"), "utf8"));
    expect(result).toMatchObject({ command: "tune", status: "interrupted" });
    // Nothing better than the start was known yet.
    expect(result.design).toEqual({ bushOdd: 60, bushEven: 60, layerA: 0, layerB: 0, layerC: 0 });
    expect(result.margin.value).toBeLessThan(0);
    expect(result.before.design).toEqual(result.design);
  });
});
