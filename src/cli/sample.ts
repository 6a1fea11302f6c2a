import { existsSync } from "node:fs";
import { join } from "node:path";
import { Command, Option } from "commander";
import { type Fault, InputError } from "../errors.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { writeMatrixMarket } from "../problem/matrix-market-writer.js";
import { suggest } from "../problem/nearest.js";
import type { Triplets } from "../problem/problem.js";
import { writeAside } from "../problem/write-aside.js";
import type { SampleModel } from "../structures/sample-model.js";
import { samples } from "../structures/samples.js";
import { wholeNumber } from "./options.js";
import { printText } from "./print.js";
import { makeFolder } from "./results-folder.js";

interface SampleOptions {
  readonly dofs?: number;
  readonly out?: string;
  readonly force?: true;
}

/** `sample`: writes a demonstration problem. */
export const sampleCommand = (): Command =>
  new Command("sample")
    .summary("write a demonstration problem")
    .description(
      "Write a demonstration problem, of chosen size where it has one, as files to look at and to run.",
    )
    .argument("<name>", `one of: ${[...samples.keys()].join(", ")}`)
    .addOption(
      new Option("--dofs <n>", "number of degrees of freedom, roughly").argParser(wholeNumber(1, 5_000_000)),
    )
    .addOption(new Option("--out <dir>", "folder for the files (default: ./<name>)"))
    .addOption(new Option("--force", "overwrite files that exist"))
    .addHelpText("after", helpText())
    .action(async (name: string, options: SampleOptions) => {
      await printText(await writeSample(name, options));
    });

function helpText(): string {
  const width = Math.max(...[...samples.keys()].map((name) => name.length)) + 2;
  const list = [...samples].map(([name, { summary }]) => `  ${name.padEnd(width)}${summary}`);
  return `\nSamples:\n${list.join("\n")}\n\nExample:\n  dampwright sample ring-brake --dofs 10000 --out brake`;
}

async function writeSample(name: string, options: SampleOptions): Promise<string> {
  const sample = samples.get(name);
  if (sample === undefined) {
    const hint = suggest(name, samples.keys(), "sample");
    throw InputError.of("input.unknown-sample", "sample", `no sample is called "${name}"`, hint);
  }
  const folder = options.out ?? name;
  const model = sample.build(options.dofs ?? sample.defaultDofs);
  const problemFile = join(folder, `${model.name}.json`);
  if (options.force === undefined) refuseToOverwrite([problemFile, ...pathsOf(model, folder)]);
  makeFolder(folder);
  for (const [file, { matrix, symmetry }] of model.matrices) {
    await writeMatrixMarket(join(folder, file), tripletsOf(matrix), symmetry);
  }
  await writeAside(problemFile, [problemText(model.problem)]);
  const with_ = model.matrices.size === 0 ? "" : ` and ${model.matrices.size} matrix files beside it`;
  return `Wrote ${problemFile}${with_}.\nNext: dampwright margin ${problemFile}\n`;
}

function pathsOf({ matrices }: SampleModel, folder: string): string[] {
  return [...matrices.keys()].map((file) => join(folder, file));
}

function refuseToOverwrite(paths: readonly string[]): void {
  const message = "the file exists";
  const hint = "Choose another folder with --out, or overwrite with --force.";
  const faults: Fault[] = paths
    .filter((path) => existsSync(path))
    .map((at) => ({ code: "output.exists", at, message, hint }));
  if (faults.length > 0) throw new InputError(faults);
}

/** JSON with two blanks a level, innermost lists on one line. */
function problemText(problem: object): string {
  const text = JSON.stringify(problem, null, 2);
  return `${text.replace(/\[\n\s+([^[\]{}]*?)\n\s+\]/g, (_, inner: string) => `[${inner.replace(/\n\s+/g, " ")}]`)}\n`;
}

function tripletsOf({ rows, cols, colStart, rowIndex, values }: SparseMatrix): Triplets {
  const col = new Int32Array(rowIndex.length);
  for (let j = 0; j < cols; j++) col.fill(j, colStart[j], colStart[j + 1]);
  return { rows, cols, row: rowIndex, col, value: values };
}
