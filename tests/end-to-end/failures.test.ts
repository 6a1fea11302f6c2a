import { existsSync, readdirSync, readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, it, vi } from "vitest";
import { newFolder, oneMass, run, start, writeProblem } from "./command-line.js";

describe("bad input ends with 2, nothing on standard output, and", () => {
  it.each([
    ["an unknown command", ["margn", "problem.json"], "Did you mean margin?"],
    ["an unknown option", ["margin", "problem.json", "--jsn"], "Did you mean --json?"],
    ["a missing argument", ["margin"], "problem"],
    ["a seed that is no number", ["tune", "problem.json", "--seed", "x"], "whole number"],
    ["an unknown sample", ["sample", "ring-break"], '"ring-brake"'],
    ["a size too small for the sample", ["sample", "ring-brake", "--dofs", "3"], "3"],
    ["a missing file", ["check", "none.json"], "none.json"],
    ["a name that is not declared", ["margin", "problem.json", "--at", "lod=1"], 'Did you mean "load"?'],
    ["a value outside its range", ["margin", "problem.json", "--set", "c=9"], "[0, 4] N s/m"],
    ["a value that is no number", ["margin", "problem.json", "--set", "c=thick"], "name=value"],
    ["a design file without a design", ["margin", "problem.json", "--design", "problem.txt"], "result.json"],
    ["a folder below a file", ["margin", "problem.json", "--out", "problem.json/x"], "problem.json/x"],
    ["a folder where none can be", ["margin", "problem.json", "--out", "/proc/x"], "/proc/x"],
    ["vectors below a file", ["margin", "problem.json", "--vectors", "problem.json/v.csv"], "problem.json"],
  ])("%s is named with a remedy", async (_, args, remedy) => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    writeFileSync(join(folder, "problem.txt"), "{}");
    const { status, stdout, stderr } = await run(args, folder);
    expect({ status, stdout }).toEqual({ status: 2, stdout: "" });
    expect(stderr).toContain(remedy);
    expect(stderr).not.toContain("    at ");
    expect(existsSync(join(folder, "results"))).toBe(false);
  });

  it("all faults of a file are named at once", async () => {
    const folder = newFolder();
    const terms = { ...oneMass.terms, mass: [{ matrix: "unitt" }] };
    writeProblem(folder, { ...oneMass, terms, margins: {}, budget: { cost: { formula: "c +", limit: 3 } } });
    const { status, stderr } = await run(["margin", "problem.json", "--json"], folder);
    expect(status).toBe(2);
    for (const place of ["/terms/mass/0/matrix", "/margins", "/budget/cost/formula"]) {
      expect(stderr).toContain(`problem.json ${place}`);
    }
  });
});

describe("what is no fault of the input", () => {
  it("ends with 3 and a remedy when memory runs out", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const preload = `
      import { isMainThread } from "node:worker_threads";
      if (!isMainThread) globalThis.Float64Array = class extends Float64Array {
        constructor() { throw new RangeError("Array buffer allocation failed"); }
      };`;
    const { status, stdout, stderr } = await run(["check", "problem.json"], folder, preload);
    expect({ status, stdout }).toEqual({ status: 3, stdout: "" });
    expect(stderr).toContain("--max-old-space-size");
  });

  it("ends with 70 and the stack when it is ours", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const preload = `
      import { isMainThread } from "node:worker_threads";
      if (!isMainThread) Math.hypot = Math.sqrt = Math.abs = () => { throw new TypeError("broken on purpose"); };`;
    const { status, stderr } = await run(["margin", "problem.json"], folder, preload);
    expect(status).toBe(70);
    expect(stderr).toMatch(/TypeError: broken on purpose\n +at /);
  });
});

describe("an interrupted run", () => {
  it("leaves no half-written file when the signal comes while files are written", async () => {
    const folder = newFolder();
    const preload = `
      import files from "node:fs/promises";
      import { syncBuiltinESMExports } from "node:module";
      files.rename = () => new Promise((done) => setTimeout(done, 60_000));
      syncBuiltinESMExports();`;
    const { child, ended } = start(["sample", "friction-oscillator", "--out", "."], folder, preload);
    await vi.waitFor(() => expect(readdirSync(folder)).toHaveLength(1), { timeout: 20_000 });
    child.kill("SIGINT");
    expect((await ended).status).toBe(130);
    expect(readdirSync(folder)).toEqual([]);
  });

  it.each(["SIGINT", "SIGTERM"] as const)(
    "ends with 130 within two seconds of %s and leaves a result",
    async (signal) => {
      const folder = newFolder();
      await run(["sample", "ring-brake", "--dofs", "1000", "--out", "."], folder);
      const { child, ended } = start(["tune", "ring-brake.json", "--out", "t", "--json"], folder);
      let sentAt = 0;
      // A second after the first line of progress the thread is deep in its kernels.
      child.stderr?.once("data", () => {
        setTimeout(() => {
          sentAt = Date.now();
          child.kill(signal);
        }, 1000);
      });
      const { status, stdout } = await ended;
      // The promise of the command, a property of its own and no measurement of speed.
      expect(Date.now() - sentAt).toBeLessThan(2000);
      expect(status).toBe(130);
      const result = JSON.parse(readFileSync(join(folder, "t", "result.json"), "utf8"));
      expect(result).toMatchObject({ command: "tune", status: "interrupted" });
      expect(result.inputs.length).toBeGreaterThan(5);
      expect(JSON.parse(stdout)).toEqual(result);
    },
  );
});
