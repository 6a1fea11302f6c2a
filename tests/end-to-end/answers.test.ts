import { existsSync, readdirSync, readFileSync } from "node:fs";
import { join } from "node:path";
import { describe, expect, it } from "vitest";
import { newFolder, oneMass, run, writeProblem } from "./command-line.js";

const json = (text: string) => JSON.parse(text);

/** √(4mk − c²) c / 2m. */
const radiusOf = (c: number, k: number) => (c * Math.sqrt(4 * k - c * c)) / 2;

describe("margin", () => {
  it("prints a table, writes its files to a folder of the question's own, and repeats itself", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const first = await run(["margin", "problem.json"], folder);
    expect(first.status).toBe(0);
    expect(first.stdout).toMatch(/margin +7\.053, complex stability radius, target 5 reached/);
    const path = first.stdout.trimEnd().split("\n").at(-1)!;
    expect(path).toMatch(/^results\/problem\/margin-[0-9a-f]{10}\/result\.json$/);
    const result = json(readFileSync(join(folder, path), "utf8"));
    expect(result).toMatchObject({ format: "dampwright-result/1", command: "margin", status: "trusted" });
    // The audit's own agreement is 1e-9 and better.
    expect(result.margin.value).toBeCloseTo(radiusOf(1, 50), 7);
    expect(result.inputs[0]).toMatchObject({ path: "problem.json" });
    expect(first.stdout).toContain(readFileSync(join(folder, path, "..", "summary.txt"), "utf8"));

    await run(["margin", "problem.json", "--quiet"], folder);
    expect(readdirSync(join(folder, "results", "problem"))).toHaveLength(1);
  });

  it("with --json prints the result object and nothing else", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const { status, stdout, stderr } = await run(
      ["margin", "problem.json", "--json", "--quiet", "--out", "here"],
      folder,
    );
    expect(status).toBe(0);
    expect(stderr).toBe("");
    expect(json(stdout)).toEqual(json(readFileSync(join(folder, "here", "result.json"), "utf8")));
    expect(existsSync(join(folder, "results"))).toBe(false);
  });

  it("judges other designs and one operating point, and draws the worst vector", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const set = ["--set", "c=2", "--at", "load=1", "--vectors", "drawn/worst.csv"];
    const { stdout } = await run(["margin", "problem.json", "--json", "--out", "a", ...set], folder);
    const result = json(stdout);
    expect(result.margin.at).toEqual({ load: 1 });
    expect(result.design).toEqual({ c: 2 });
    expect(result.margin.value).toBeCloseTo(radiusOf(2, 100), 7);
    const lines = readFileSync(join(folder, "drawn", "worst.csv"), "utf8")
      .trimEnd()
      .split("\n");
    expect(lines).toHaveLength(2);
    expect(lines[0]).toBe("dof,re,im,modulus");

    const again = await run(["margin", "problem.json", "--json", "--design", "a/result.json"], folder);
    expect(json(again.stdout).design).toEqual({ c: 2 });
  });

  it("ends with 1 when the target is missed", async () => {
    const folder = newFolder();
    writeProblem(folder, { ...oneMass, margin: { measure: "radius", target: 8 } });
    const { status, stdout } = await run(["margin", "problem.json"], folder);
    expect(status).toBe(1);
    expect(stdout).toContain("target 8 MISSED");
  });
});

describe("tune", () => {
  it("shows before and after side by side and keeps the limit", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const { status, stdout, stderr } = await run(["tune", "problem.json", "--out", "t"], folder);
    expect(status).toBe(0);
    expect(stderr).toContain("building the model");
    expect(stdout).toMatch(/margin +[\d.]+, complex stability radius, target 5 reached\n/);
    expect(stdout).toMatch(/ before +after\n/);
    const result = json(readFileSync(join(folder, "t", "result.json"), "utf8"));
    // More damping is better here, so the limit c ≤ 3 decides; limits are kept to 1e-6 of themselves.
    expect(result.design.c).toBeCloseTo(3, 5);
    expect(result.margin.value).toBeCloseTo(radiusOf(3, 50), 4);
    expect(result.before.margin.value).toBeCloseTo(radiusOf(1, 50), 7);
  });

  it("takes its seed from the command line", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const { stdout } = await run(["tune", "problem.json", "--seed", "7", "--json"], folder);
    expect(json(stdout).seed).toBe(7);
  });
});

describe("check", () => {
  it("says that a model is sound", async () => {
    const folder = newFolder();
    writeProblem(folder, oneMass);
    const { status, stdout } = await run(["check", "problem.json"], folder);
    expect(status).toBe(0);
    expect(stdout).toMatch(/model +sound/);
  });

  it("ends with 1 on an unsound one, with the result printed all the same", async () => {
    const folder = newFolder();
    const damping = [{ matrix: "unit", factor: "c - 2" }];
    writeProblem(folder, { ...oneMass, terms: { ...oneMass.terms, damping } });
    const { status, stdout } = await run(["check", "problem.json", "--json"], folder);
    expect(status).toBe(1);
    expect(json(stdout)).toMatchObject({ command: "check", status: "unsound" });
  });
});

describe("sample", () => {
  it("writes a problem that can be run, and overwrites nothing unless told to", async () => {
    const folder = newFolder();
    const written = await run(["sample", "ring-brake", "--dofs", "600"], folder);
    expect(written.status).toBe(0);
    const files = readdirSync(join(folder, "ring-brake"));
    expect(files).toContain("ring-brake.json");
    expect(files.filter((file) => file.endsWith(".mtx")).length).toBeGreaterThan(5);
    expect((await run(["check", "ring-brake/ring-brake.json"], folder)).status).toBe(0);

    const again = await run(["sample", "ring-brake", "--dofs", "600"], folder);
    expect(again.status).toBe(2);
    expect(again.stderr).toContain("--force");
    expect((await run(["sample", "ring-brake", "--dofs", "600", "--force"], folder)).status).toBe(0);
  });

  it.each(["friction-oscillator", "cross-coupled-rotor"])("writes %s as one file", async (name) => {
    const folder = newFolder();
    await run(["sample", name, "--out", "."], folder);
    expect(readdirSync(folder)).toEqual([`${name}.json`]);
    expect((await run(["check", `${name}.json`], folder)).status).toBe(0);
  });
});

describe("help", () => {
  it("without a command says what to do next", async () => {
    const { status, stdout } = await run([], newFolder());
    expect(status).toBe(0);
    expect(stdout).toContain("dampwright sample ring-brake");
  });

  it.each(["check", "margin", "tune", "sample"])("of %s shows an example", async (command) => {
    const { status, stdout } = await run([command, "--help"], newFolder());
    expect(status).toBe(0);
    expect(stdout).toMatch(new RegExp(`Examples?:\n {2}dampwright ${command} `));
  });
});
