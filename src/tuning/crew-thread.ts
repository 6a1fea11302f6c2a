/** Entry of the threads of a crew; each holds the shared model and answers one question at a time. */

import { Tinypool } from "tinypool";
import { NumericalError } from "../errors.js";
import { type FactorisationCounts, FullModel } from "../fullorder/full-model.js";
import { type FullTasks, fullTasks } from "../margin/full-tasks.js";
import type { ParametricModel } from "../model/parametric-model.js";
import type { SymbolicAnalysis } from "../numerics/sparse/analysis.js";
import { revive } from "../parallel/share.js";
import { programFormula, type Step } from "../problem/formula-program.js";

/** What every thread starts from; formulas stand by their steps. */
export interface ThreadStart {
  readonly model: ParametricModel;
  readonly analysis: SymbolicAnalysis;
}

export interface ThreadRequest {
  readonly task: keyof FullTasks & string;
  readonly input: unknown;
}

/** An answer with what it cost, or the parts of a `NumericalError`, whose class does not survive the way. */
export type ThreadAnswer =
  | { readonly output: unknown; readonly counts: FactorisationCounts }
  | { readonly refused: string; readonly message: string; readonly hint: string };

let full: FullModel | undefined;

function held(): FullModel {
  if (full === undefined) {
    const { model, analysis } = revive(Tinypool.workerData as ThreadStart, restoreFormula);
    full = new FullModel(model, analysis);
  }
  return full;
}

function restoreFormula(value: object): object | undefined {
  if (!("formula" in value)) return undefined;
  const { text, steps } = value.formula as { text: string; steps: readonly Step[] };
  return programFormula(text, steps);
}

export function evidence({ task, input }: ThreadRequest): ThreadAnswer {
  const model = held();
  const before = { ...model.counts };
  try {
    const output = fullTasks[task](model, input as never);
    const { complex, real } = model.counts;
    return { output, counts: { complex: complex - before.complex, real: real - before.real } };
  } catch (error) {
    if (!(error instanceof NumericalError)) throw error;
    return { refused: error.code, message: error.message, hint: error.hint };
  }
}
