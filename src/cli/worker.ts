/** Entry of the thread that computes, so that the parent stays free to draw progress and to be interrupted. */

import { parentPort, workerData } from "node:worker_threads";
import { type Fault, InputError, invariant } from "../errors.js";
import type { Problem } from "../problem/problem.js";
import { readProblem } from "../problem/read-problem.js";
import { checkProblem } from "../tuning/check-problem.js";
import { type CommandContext, computeMargin, tuneProblem } from "../tuning/commands.js";
import { failureOf } from "./failure.js";
import type { JobDone, JobMessage, JobRequest } from "./job.js";
import { resolveValues } from "./named-values.js";

function send(message: JobMessage): void {
  invariant(parentPort !== null, "the worker runs as a thread");
  parentPort.postMessage(message);
}

async function perform(request: JobRequest): Promise<JobDone> {
  const problem = await readProblem(request.problem);
  const { title, inputs } = problem;
  const given = valuesOf(request, problem);
  send({ type: "opened", opened: { title, inputs } });
  return await answer(request, problem, given);
}

interface Given {
  readonly design: ReadonlyMap<string, number>;
  readonly at: ReadonlyMap<string, number>;
}

function valuesOf(request: JobRequest, problem: Problem): Given {
  const faults: Fault[] = [];
  const design = resolveValues(request.design, problem.design, "design variable", faults);
  const at = resolveValues(request.at, problem.envelope, "operating parameter", faults);
  if (faults.length > 0) throw new InputError(faults);
  return { design, at };
}

async function answer(request: JobRequest, problem: Problem, { design, at }: Given): Promise<JobDone> {
  const { command, version, seed, threads } = request;
  const context: CommandContext = {
    version,
    threads,
    progress: (progress) => send({ type: "progress", progress }),
    snapshot: (result) => send({ type: "snapshot", result }),
  };
  switch (command) {
    case "check":
      return { result: checkProblem(problem, { version }, context.progress), vectors: null };
    case "margin":
      return await computeMargin(problem, { design, ...(at.size === 0 ? {} : { at }) }, context);
    case "tune":
      return await tuneProblem(problem, { design, ...(seed === null ? {} : { seed }) }, context);
  }
}

try {
  send({ type: "done", done: await perform(workerData) });
} catch (error) {
  send({ type: "failed", failure: failureOf(error) });
}
