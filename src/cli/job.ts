/** What the command line and the thread that computes say to each other: plain data only. */

import type { InputFile } from "../problem/problem.js";
import type { CheckResult } from "../tuning/check-problem.js";
import type { WorstVector } from "../tuning/commands.js";
import type { MarginCommandResult, TuneCommandResult } from "../tuning/result.js";
import type { Progress } from "../tuning/session.js";
import type { Failure } from "./failure.js";
import type { NamedValue } from "./named-values.js";

export type CommandResult = CheckResult | MarginCommandResult | TuneCommandResult;

/** A result of a run that was interrupted before it had any numbers. */
export interface EmptyResult
  extends Pick<CommandResult, "format" | "command" | "version" | "title" | "inputs"> {
  readonly status: "interrupted";
}

/** One order to compute. */
export interface JobRequest {
  readonly command: "check" | "margin" | "tune";
  /** Path of the problem file. */
  readonly problem: string;
  readonly version: string;
  /** Design values that differ from the file's start values. */
  readonly design: readonly NamedValue[];
  /** Operating values to judge at; empty: the whole envelope. */
  readonly at: readonly NamedValue[];
  /** null: the problem file's. */
  readonly seed: number | null;
  readonly threads: number;
}

/** What is known of the problem once it has been read. */
export interface Opened {
  readonly title: string;
  readonly inputs: readonly InputFile[];
}

export interface JobDone {
  readonly result: CommandResult;
  readonly vectors: WorstVector | null;
}

export type JobMessage =
  | { readonly type: "opened"; readonly opened: Opened }
  | { readonly type: "progress"; readonly progress: Progress }
  | { readonly type: "snapshot"; readonly result: CommandResult }
  | { readonly type: "done"; readonly done: JobDone }
  | { readonly type: "failed"; readonly failure: Failure };
