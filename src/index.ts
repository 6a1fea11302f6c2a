/**
 * The library: everything that the commands do, as typed functions.
 *
 *     const problem = await readProblem("brake.json");
 *     const { result } = computeMargin(problem, {}, { version: "mine", progress: () => {}, snapshot: () => {} });
 */

export { ExpectedError, type Fault, InputError, NumericalError } from "./errors.js";
export type {
  Formula,
  InputFile,
  Limit,
  MarginSettings,
  NamedMatrix,
  OperatingParameter,
  Perturbation,
  Problem,
  Term,
  TermGroup,
  Triplets,
  TuneSettings,
  Variable,
} from "./problem/problem.js";
export type { ProblemFile } from "./problem/problem-file.js";
export { readProblem } from "./problem/read-problem.js";
export { checkText } from "./report/check-text.js";
export { marginText } from "./report/margin-text.js";
export { tuneText } from "./report/tune-text.js";
export type { SampleMatrix, SampleModel } from "./structures/sample-model.js";
export { type Sample, samples } from "./structures/samples.js";
export { type CheckResult, checkProblem } from "./tuning/check-problem.js";
export {
  type CommandContext,
  computeMargin,
  type MarginOptions,
  type TuneCommandOptions,
  tuneProblem,
  type WorstVector,
} from "./tuning/commands.js";
export type * from "./tuning/result.js";
export type { Progress, ReportProgress } from "./tuning/session.js";
