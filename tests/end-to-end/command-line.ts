/** Runs the built command line in a child process, in a folder of its own. */

import { type ChildProcess, spawn } from "node:child_process";
import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join, resolve } from "node:path";
import { onTestFinished } from "vitest";

const main = resolve("dist/cli/main.js");

export interface Ended {
  readonly status: number | null;
  readonly signal: string | null;
  readonly stdout: string;
  readonly stderr: string;
}

export interface Running {
  readonly child: ChildProcess;
  readonly ended: Promise<Ended>;
}

/** A folder that goes with the test that asked for it. */
export function newFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), "dampwright-cli-"));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  return folder;
}

/** Starts `dampwright` with `args` in `folder`; `preload` is a module that every thread runs first. */
export function start(args: readonly string[], folder: string, preload?: string): Running {
  const NODE_OPTIONS =
    preload === undefined ? "" : `--import data:text/javascript,${encodeURIComponent(preload)}`;
  const child = spawn(process.execPath, [main, ...args], {
    cwd: folder,
    env: { ...process.env, NODE_OPTIONS },
  });
  let [stdout, stderr] = ["", ""];
  child.stdout.on("data", (data) => {
    stdout += String(data);
  });
  child.stderr.on("data", (data) => {
    stderr += String(data);
  });
  const ended = new Promise<Ended>((done) =>
    child.on("close", (status, signal) => done({ status, signal, stdout, stderr })),
  );
  return { child, ended };
}

export const run = (args: readonly string[], folder: string, preload?: string): Promise<Ended> =>
  start(args, folder, preload).ended;

/**
 * One mass on a spring k = 100 N/m times the load and a dashpot c: the radius of a complex spring error of 1 N/m is
 * c √(4mk − c²) / 2m, so 7.053368 N/m at c = 1 and the lowest load, 0.5.
 */
export const oneMass = {
  format: "dampwright/1",
  title: "One mass",
  dofs: 1,
  matrices: { unit: { entries: [[1, 1, 1]] } },
  constants: { k: 100 },
  design: { c: { range: [0, 4], start: 1, unit: "N s/m" } },
  envelope: { load: { range: [0.5, 1.5] } },
  terms: {
    mass: [{ matrix: "unit" }],
    damping: [{ matrix: "unit", factor: "c" }],
    stiffness: [{ matrix: "unit", factor: "k*load" }],
  },
  perturbations: [
    { name: "spring", acts: "stiffness", kind: "complex", size: 1, left: "identity", right: "identity" },
  ],
  margin: { measure: "radius", target: 5 },
  budget: { cost: { formula: "c", limit: 3 } },
};

export function writeProblem(folder: string, problem: object, name = "problem.json"): string {
  writeFileSync(join(folder, name), JSON.stringify(problem));
  return name;
}
