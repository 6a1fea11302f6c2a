import { createHash } from "node:crypto";
import { accessSync, constants, existsSync, mkdirSync } from "node:fs";
import { basename, dirname, join, resolve, sep } from "node:path";
import { InputError } from "../errors.js";
import type { InputFile } from "../problem/problem.js";
import { writeAside } from "../problem/write-aside.js";
import type { JobRequest } from "./job.js";

/**
 * Where a result goes unless told otherwise: results/<problem>/<command>-<hash>, the hash made of the inputs'
 * hashes, the options that change numbers, and the version, so that the same question always has the same folder.
 */
export function resultsFolder(request: JobRequest, inputs: readonly InputFile[]): string {
  const { command, problem, version, design, at, seed } = request;
  const plain = (values: JobRequest["at"]) => values.map(({ name, value }) => [name, value]).sort();
  const asked = [inputs.map(({ sha256 }) => sha256), plain(design), plain(at), seed, version];
  const hash = createHash("sha256").update(JSON.stringify(asked)).digest("hex").slice(0, 10);
  return join("results", basename(problem, ".json"), `${command}-${hash}`);
}

/**
 * Makes a folder, with those above it, before long work rather than after it.
 *
 * @throws InputError `output.unwritable`.
 */
export function makeFolder(folder: string): void {
  try {
    makeLevels(resolve(folder));
    // A path ending in a separator is one of a folder only.
    accessSync(join(folder, sep), constants.W_OK);
  } catch (error) {
    const reason = error instanceof Error && "code" in error ? String(error.code) : String(error);
    const message = `the folder cannot be written to (${reason})`;
    throw InputError.of("output.unwritable", folder, message, "Give a folder you may write to.");
  }
}

/** One level at a time: Node's own recursive call never returns where the file system invents its folders (/proc). */
function makeLevels(folder: string): void {
  if (existsSync(folder)) return;
  makeLevels(dirname(folder));
  try {
    mkdirSync(folder);
  } catch (error) {
    // Another run may have made it in between.
    if (!existsSync(folder)) throw error;
  }
}

/** Makes the folder of a file to be written later. */
export function makeFolderOf(file: string): void {
  makeFolder(dirname(file));
}

/** Writes result.json and summary.txt and tells the path of the first. */
export async function writeResult(folder: string, result: object, summary: string): Promise<string> {
  const path = join(folder, "result.json");
  await writeAside(path, [jsonText(result)]);
  await writeAside(join(folder, "summary.txt"), [summary]);
  return path;
}

/** A result as it stands in its file and on standard output; infinite values become null. */
export function jsonText(result: object): string {
  return `${JSON.stringify(result, null, 2)}\n`;
}
