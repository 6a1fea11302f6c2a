/** The way every reference value goes: a problem file on disk, read back, answered by the library's function. */

import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { onTestFinished } from "vitest";
import type { Matrix, ProblemFile } from "../../src/problem/problem-file.js";
import { readProblem } from "../../src/problem/read-problem.js";
import {
  type CommandContext,
  computeMargin,
  type MarginOptions,
  tuneProblem,
} from "../../src/tuning/commands.js";
import type { MarginCommandResult, TuneCommandResult } from "../../src/tuning/result.js";

export type Questions = Omit<ProblemFile, "format">;

const quiet: CommandContext = { version: "test", progress: () => {}, snapshot: () => {} };

async function written(problem: Questions) {
  const folder = mkdtempSync(join(tmpdir(), "dampwright-reference-"));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  const path = join(folder, "problem.json");
  writeFileSync(path, JSON.stringify({ format: "dampwright/1", ...problem }));
  return readProblem(path);
}

export async function marginOf(
  problem: Questions,
  options: MarginOptions = {},
): Promise<MarginCommandResult> {
  return (await computeMargin(await written(problem), options, quiet)).result;
}

export async function tuned(problem: Questions): Promise<TuneCommandResult> {
  return (await tuneProblem(await written(problem), {}, quiet)).result;
}

/** A dense matrix by its entries; the zeros are left out. */
export function entries(rows: readonly (readonly number[])[]): Matrix {
  const list: [number, number, number][] = rows.flatMap((row, i) =>
    row.flatMap((value, j): [number, number, number][] => (value === 0 ? [] : [[i + 1, j + 1, value]])),
  );
  return { entries: list };
}

const groups = {
  M: "mass",
  D: "damping",
  G: "gyroscopic",
  K: "stiffness",
  N: "circulatory",
  F: "frictional",
} as const;

/** Dense M, D, G, K, N, F as the matrices and terms of a problem file, each named by its letter. */
export function model(
  matrices: Partial<Record<keyof typeof groups, readonly (readonly number[])[]>>,
): Pick<ProblemFile, "dofs" | "matrices" | "terms"> {
  const given = Object.entries(matrices);
  return {
    dofs: given[0]![1].length,
    matrices: Object.fromEntries(given.map(([name, rows]) => [name, entries(rows)])),
    terms: Object.fromEntries(
      Object.entries(groups).flatMap(([name, group]) =>
        name in matrices ? [[group, [{ matrix: name }]]] : [],
      ),
    ),
  };
}

/** f·A. */
export function scaled(f: number, rows: readonly (readonly number[])[]): number[][] {
  return rows.map((row) => row.map((value) => f * value));
}

/** ω in rad/s of a result's frequency. */
export function omegaOf({ margin }: Pick<MarginCommandResult, "margin">): number | null {
  return margin.breaksAtHz === null ? null : 2 * Math.PI * margin.breaksAtHz;
}
