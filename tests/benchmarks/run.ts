/**
 * `npm run bench -- [options]`: what solves of the full model cost beside native codes, and what the parts of
 * `margin` and `tune` cost. Every row is a child process, so that memory and compiled code are its own.
 */

import { spawnSync } from "node:child_process";
import { mkdtempSync, rmSync } from "node:fs";
import { availableParallelism, cpus, freemem, loadavg, tmpdir } from "node:os";
import { join } from "node:path";
import { parseArgs } from "node:util";
import { writeArrays } from "./exchange.js";
import { benchmarkModel, gridOf, type Shape, shapeNamed } from "./models.js";
import { BLOCK, type Outcome } from "./row.js";
import { type Comparison, goalSummary } from "./summary.js";
import { type NamedOutcome, solverTable } from "./table.js";

const usage = `npm run bench -- [options]
  --models LIST    shape and thousands of dofs (default plate10,slab10,cube10,plate30,slab30,cube30)
  --large          adds plate100, slab100, cube100 and, without peers, plate1000
  --kernels LIST   of fma,simd,plain,blas (default all; blas: large products by the machine's OpenBLAS, by way of the
                   npm package koffi)
  --no-peers       leaves out SuperLU and UMFPACK
  --no-ring-brake  leaves out the parts of margin and tune
  --no-two-cores   leaves out the same work by one thread and by two
  --limit-s N      stops a row after so many seconds (default 300)
  --seed N         of the models (default 1)
`;

const { values: options } = parseArgs({
  allowNegative: true,
  options: {
    models: { type: "string", default: "plate10,slab10,cube10,plate30,slab30,cube30" },
    large: { type: "boolean", default: false },
    kernels: { type: "string", default: "fma,simd,plain,blas" },
    peers: { type: "boolean", default: true },
    "ring-brake": { type: "boolean", default: true },
    "two-cores": { type: "boolean", default: true },
    "limit-s": { type: "string", default: "300" },
    seed: { type: "string", default: "1" },
    help: { type: "boolean", default: false },
  },
});
const here = (file: string): string => new URL(file, import.meta.url).pathname;
/** This file runs from dist/tests/benchmarks. */
const peersScript = here("../../../peers.py");
/** Children beyond this leave the machine to others. */
const ADDRESS_SPACE = Math.floor(0.8 * freemem());
const LARGEST_FOR_PEERS = 100_000;
const peerNames = { superlu: "SuperLU (MMD)", umfpack: "UMFPACK (METIS)" };
/** The kernel that the goals are about. */
const SUMMED_UP = "fma";

function main(): void {
  const models = `${options.models}${options.large ? ",plate100,slab100,cube100,plate1000" : ""}`
    .split(",")
    .map(parseModel);
  const load = loadavg()[0]?.toFixed(1);
  const date = new Date().toISOString().slice(0, 16).replace("T", " ");
  print(
    `${cpus()[0]?.model}, ${availableParallelism()} cores, load ${load}, Node ${process.version}, ${date} UTC\n`,
  );
  const comparisons: Comparison[] = [];
  for (const { shape, dofs } of models) {
    const grid = gridOf(shape, dofs).join(" × ");
    print(`\n${shape} of ${grid} nodes, 3 dofs each, seed ${options.seed}\n`);
    const rows = [...ownRows(shape, dofs), ...peerRows(shape, dofs)];
    print(solverTable(rows));
    comparisons.push(comparisonOf(`${shape}${dofs / 1000}`, shape, rows));
  }
  print(`\n${legend}`);
  if (options["ring-brake"]) runTable("ring-brake.js");
  if (options["two-cores"]) runTable("two-cores.js");
  print(
    `\ntimes of ${ownName(SUMMED_UP)} over those of native solvers, and the goals\n${goalSummary(comparisons)}`,
  );
}

/** A child that prints a table of its own. */
function runTable(script: string): void {
  print("\n");
  const { status } = spawnSync(process.execPath, [here(script)], { stdio: "inherit" });
  if (status !== 0) process.exitCode = 1;
}

function comparisonOf(model: string, shape: Shape, rows: readonly NamedOutcome[]): Comparison {
  const of = (wanted: string): Outcome =>
    rows.find(({ name }) => name === wanted)?.outcome ?? { absent: "left out" };
  return {
    model,
    shape,
    ours: of(ownName(SUMMED_UP)),
    superlu: of(peerNames.superlu),
    umfpack: of(peerNames.umfpack),
  };
}

const legend = `ordering  ordering and symbolic analysis, first call
factor    least of up to twenty runs, and how far the slowest, for us the first, lay above it; ÷ ours: over the first row
solve 1, solve ${BLOCK}  per right-hand side, alone and in a block of ${BLOCK}; least of up to twenty
memory    factors and work space by the solver's own account; resident: rise of peak memory during the work
LU fill   stored entries of L and U;  backward error: computed here alike for all, infinity norms
All on one thread, in processor seconds; real and complex operations both counted as real ones.
`;

function parseModel(text: string): { shape: Shape; dofs: number } {
  const match = /^([a-z]+)([1-9]\d*)$/.exec(text);
  const shape = shapeNamed(match?.[1]);
  if (shape === undefined) {
    process.stderr.write(`"${text}" is no model; say for example plate10 or slab30.\n${usage}`);
    process.exit(2);
  }
  return { shape, dofs: 1000 * Number(match?.[2]) };
}

const ownName = (kernel: string): string => `ours, ${kernel}`;

function ownRows(shape: Shape, dofs: number): NamedOutcome[] {
  const run = (kernel: string, kind: string): Outcome =>
    childOutcome(process.execPath, [here("measure.js"), shape, `${dofs}`, options.seed, kind], {
      ...untunedBlas,
      DAMPWRIGHT_KERNEL: kernel,
    });
  const kernels = options.kernels.split(",");
  return [
    ...kernels.map((kernel) => ({
      name: ownName(kernel),
      comparable: true,
      outcome: run(kernel, "complex"),
    })),
    ...kernels.map((kernel) => ({
      name: `real LDLᵀ, ${kernel}`,
      comparable: false,
      outcome: run(kernel, "symmetric"),
    })),
  ];
}

function peerRows(shape: Shape, dofs: number): NamedOutcome[] {
  if (!options.peers) return [];
  const named = (outcome: (peer: string) => Outcome): NamedOutcome[] =>
    Object.entries(peerNames).map(([peer, name]) => ({ name, comparable: true, outcome: outcome(peer) }));
  if (dofs > LARGEST_FOR_PEERS) return named(() => ({ absent: `not run beyond ${LARGEST_FOR_PEERS} dofs` }));
  const folder = mkdtempSync(join(tmpdir(), "dampwright-bench-"));
  try {
    const file = join(folder, "matrix");
    const { pattern, dynamic } = benchmarkModel(shape, dofs, Number(options.seed));
    const sizes = Int32Array.of(pattern.cols, pattern.rowIndex.length);
    writeArrays(file, [sizes, pattern.colStart, pattern.rowIndex, dynamic.re, dynamic.im]);
    return named((peer) => peerOutcome([peersScript, peer, file, `${BLOCK}`, `${ADDRESS_SPACE}`]));
  } finally {
    rmSync(folder, { recursive: true });
  }
}

/** Neither we nor peers profit from what somebody set. */
const untunedBlas = { OPENBLAS_CORETYPE: undefined, OPENBLAS_L2_SIZE: undefined };

/** The first Python that has what the peer needs; Debian's may stand behind another one. */
function peerOutcome(args: string[]): Outcome {
  const environment = { ...untunedBlas, OPENBLAS_NUM_THREADS: "1", OMP_NUM_THREADS: "1" };
  const first = childOutcome("python3", args, environment);
  if (!("absent" in first) || !first.absent.includes("No module")) return first;
  const second = childOutcome("/usr/bin/python3", args, environment);
  return "absent" in second ? first : second;
}

function childOutcome(
  program: string,
  args: string[],
  environment: Record<string, string | undefined>,
): Outcome {
  const { status, signal, stdout, stderr, error } = spawnSync(program, args, {
    env: { ...process.env, ...environment },
    encoding: "utf8",
    timeout: 1000 * Number(options["limit-s"]),
    killSignal: "SIGKILL",
  });
  if (error !== undefined && signal !== null) return { absent: `stopped after ${options["limit-s"]} s` };
  if (error !== undefined)
    return { absent: `${program}: ${/ENOENT/.test(error.message) ? "not found" : error.message}` };
  if (status !== 0) return { absent: `ended with ${signal ?? status}: ${saidAbout(stderr)}` };
  return JSON.parse(stdout);
}

/** The line that names the error, among traces of Node or Python. */
function saidAbout(stderr: string): string {
  const lines = stderr.trim().split("\n");
  return (lines.findLast((line) => /^\w*Error\b/.test(line)) ?? lines[lines.length - 1]).slice(0, 200);
}

function print(text: string): void {
  process.stdout.write(text);
}

if (options.help) print(usage);
else main();
