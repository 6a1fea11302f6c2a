import { basename } from "node:path";
import { writeAside } from "../problem/write-aside.js";
import { vectorsCsv } from "../report/vectors-csv.js";
import { exitStatus } from "./exit-status.js";
import type { CommandResult, EmptyResult, JobDone, JobRequest, Opened } from "./job.js";
import { printText } from "./print.js";
import { progressDisplay } from "./progress-display.js";
import { jsonText, makeFolder, makeFolderOf, resultsFolder, writeResult } from "./results-folder.js";
import { summaryText } from "./summary.js";
import { supervise } from "./supervise.js";

/** Where the answer goes. */
export interface Output {
  /** Print the result object instead of the table. */
  readonly json: boolean;
  /** No progress. */
  readonly quiet: boolean;
  /** Folder for the result; undefined: `resultsFolder`. */
  readonly out: string | undefined;
  /** CSV file for the worst vector. */
  readonly vectors: string | undefined;
}

const workerScript = new URL("./worker.js", import.meta.url);

/**
 * Computes an answer in a thread of its own, writes its files, prints it, and tells the exit status. Interrupted, it
 * leaves the best answer so far.
 */
export async function runJob(
  request: JobRequest,
  output: Output,
  script: URL = workerScript,
): Promise<number> {
  let opened: Opened = { title: basename(request.problem, ".json"), inputs: [] };
  let best: CommandResult | undefined;
  const folder = (): string => output.out ?? resultsFolder(request, opened.inputs);
  if (output.vectors !== undefined) makeFolderOf(output.vectors);
  const display = progressDisplay(output.quiet);
  let done: JobDone | null;
  try {
    done = await supervise(script, request, {
      opened: (found) => {
        opened = found;
        makeFolder(folder());
      },
      progress: display.show,
      snapshot: (result) => {
        best = result;
      },
    });
  } finally {
    display.stop();
  }
  const result = done?.result ?? interruptedResult(request, opened, best);
  makeFolder(folder());
  const summary = summaryText(result);
  const path = await writeResult(folder(), result, summary);
  if (output.vectors !== undefined && done !== null) await writeVectors(output.vectors, done);
  await printText(output.json ? jsonText(result) : `${summary}\n${path}\n`);
  return exitStatus(result);
}

function interruptedResult(
  { command, version }: JobRequest,
  { title, inputs }: Opened,
  best: CommandResult | undefined,
): CommandResult | EmptyResult {
  if (best !== undefined) return { ...best, status: "interrupted" };
  return { format: "dampwright-result/1", command, version, title, status: "interrupted", inputs };
}

async function writeVectors(file: string, { vectors }: JobDone): Promise<void> {
  if (vectors === null) console.error(`No worst vector: nothing breaks, so ${file} was not written.`);
  else await writeAside(file, vectorsCsv(vectors));
}
