import { availableParallelism } from "node:os";
import { InvalidArgumentError, Option } from "commander";
import type { JobRequest } from "./job.js";
import { parseAssignments, readDesign } from "./named-values.js";
import { type Output, runJob } from "./run-job.js";
import { version } from "./version.js";

/** What commander makes of the options that the commands share. */
export interface GivenOptions {
  readonly json?: true;
  readonly quiet?: true;
  readonly out?: string;
  readonly vectors?: string;
  readonly set?: readonly string[];
  readonly design?: string;
  readonly at?: readonly string[];
  readonly seed?: number;
  readonly threads?: number;
}

const gather = (list: string, previous: readonly string[] = []): string[] => [...previous, list];

/** Options of every command that computes. */
export const outputOptions = (): Option[] => [
  new Option("--json", "print the result object and nothing else"),
  new Option("--out <dir>", "folder for the result (default: results/<problem>/<command>-<hash>)"),
  new Option("--quiet", "show no progress"),
];

export const designOptions = (): Option[] => [
  new Option("--set <name=value,...>", "design values instead of the start values").argParser(gather),
  new Option("--design <result.json>", "take the design of a result; --set overrides it"),
];

export const vectorsOption = (): Option =>
  new Option("--vectors <file.csv>", "write the worst vector by dof, to be drawn on your own mesh");

export const atOption = (): Option =>
  new Option(
    "--at <name=value,...>",
    "judge at this operating point (others nominal), not over the envelope",
  ).argParser(gather);

export const seedOption = (): Option =>
  new Option("--seed <n>", "seed of the random numbers (default: the problem file's)").argParser(
    wholeNumber(0, 2 ** 32 - 1),
  );

export const threadsOption = (): Option =>
  new Option(
    "--threads <n>",
    "threads to compute with; the result does not depend on it (default: as many as the machine has cores)",
  ).argParser(wholeNumber(1, 64));

/** Parser of a whole number between two ends. */
export function wholeNumber(low: number, high: number): (text: string) => number {
  return (text) => {
    const value = Number(text);
    if (/^\d+$/.test(text) && value >= low && value <= high) return value;
    throw new InvalidArgumentError(`Expected a whole number from ${low} to ${high}.`);
  };
}

/** Runs one of the computing commands and sets the exit status. */
export async function runCommand(
  command: JobRequest["command"],
  problem: string,
  options: GivenOptions,
): Promise<void> {
  const fromFile = options.design === undefined ? [] : await readDesign(options.design);
  const set = parseAssignments(options.set ?? [], "--set");
  const overridden = new Set(set.map(({ name }) => name));
  const request: JobRequest = {
    command,
    problem,
    version,
    design: [...fromFile.filter(({ name }) => !overridden.has(name)), ...set],
    at: parseAssignments(options.at ?? [], "--at"),
    seed: options.seed ?? null,
    threads: options.threads ?? availableParallelism(),
  };
  const output: Output = {
    json: options.json ?? false,
    quiet: options.quiet ?? false,
    out: options.out,
    vectors: options.vectors,
  };
  process.exitCode = await runJob(request, output);
}
