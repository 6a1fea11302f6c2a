#!/usr/bin/env node
import { CommanderError } from "commander";
import { ExpectedError, InputError } from "../errors.js";
import { removeUnfinished } from "../problem/write-aside.js";
import { buildProgram } from "./program.js";

const bug = 70;
const interrupted = 130;

// A running job takes the first signal for itself. What comes while files are written ends the process, tidily.
for (const signal of ["SIGINT", "SIGTERM"] as const) {
  process.on(signal, () => {
    if (process.listenerCount(signal) > 1) return;
    removeUnfinished();
    process.exit(interrupted);
  });
}

/** Says on standard error what went wrong and tells the exit status. */
function explain(error: unknown): number {
  // Commander has said what there is to say.
  if (error instanceof CommanderError) return error.exitCode === 0 ? 0 : 2;
  if (error instanceof InputError) {
    console.error(error.message);
    return error.exitCode;
  }
  if (error instanceof ExpectedError) {
    console.error(`${error.message}\n  ${error.hint}`);
    return error.exitCode;
  }
  const stack = error instanceof Error ? (error.stack ?? error.message) : String(error);
  console.error(`A fault of this program, not of your input. Please report it with these lines:\n${stack}`);
  return bug;
}

const program = buildProgram();
if (process.argv.length <= 2) {
  program.outputHelp();
} else {
  try {
    await program.parseAsync();
  } catch (error) {
    process.exitCode = explain(error);
  }
}
