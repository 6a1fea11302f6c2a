/** Entry of the threads of a crew; each holds the shared model and answers one question at a time. */

import { Tinypool } from "tinypool";
import { NumericalError } from "../errors.js";
import { type FactorisationCounts, FullModel } from "../fullorder/full-model.js";
import { type FullTasks, fullTasks } from "../margin/full-tasks.js";
import type { SymbolicAnalysis } from "../numerics/sparse/analysis.js";
import { revive } from "../parallel/share.js";
import { programFormula, type Step } from "../problem/formula-program.js";
import { ReducedModel, type ReducedSnapshot } from "../reduction/reduced-model.js";
import { SearchModel, type SearchParts } from "./search-model.js";
import { type SearchTasks, searchTasks } from "./search-tasks.js";

/** Stands for a formula on its way to a thread. */
export interface FormulaStandIn {
  readonly formulaText: string;
  readonly formulaSteps: readonly Step[];
}

/** What every thread starts from; formulas stand by their steps. */
export interface ThreadStart extends Omit<SearchParts, "reducedAt"> {
  readonly analysis: SymbolicAnalysis;
}

export interface EvidenceRequest {
  readonly task: keyof FullTasks & string;
  readonly input: unknown;
}

export interface SearchRequest {
  readonly task: keyof SearchTasks & string;
  readonly input: unknown;
  readonly reduced: ReducedSnapshot;
}

interface Cost extends FactorisationCounts {
  reducedEvaluations: number;
}

/** An answer with what it cost, or the parts of a `NumericalError`, whose class does not survive the way. */
export type ThreadAnswer =
  | { readonly output: unknown; readonly cost: Cost }
  | { readonly refused: string; readonly message: string; readonly hint: string };

const start = revive(Tinypool.workerData as ThreadStart, restoreFormula);
let full: FullModel | undefined;

function restoreFormula(value: object): object | undefined {
  if (!("formulaSteps" in value)) return undefined;
  const { formulaText, formulaSteps } = value as FormulaStandIn;
  return programFormula(formulaText, formulaSteps);
}

export async function evidence({ task, input }: EvidenceRequest): Promise<ThreadAnswer> {
  full ??= new FullModel(start.model, start.analysis);
  const { counts } = full;
  const before = { ...counts };
  const held = full;
  return await answer(
    () => fullTasks[task](held, input as never),
    () => ({
      complex: counts.complex - before.complex,
      real: counts.real - before.real,
      reducedEvaluations: 0,
    }),
  );
}

export async function search({ task, input, reduced }: SearchRequest): Promise<ThreadAnswer> {
  const model = ReducedModel.from(start.model, reduced);
  const held = new SearchModel({ ...start, reducedAt: (state) => model.pencilAt(state) });
  return await answer(
    async () => await searchTasks[task](held, input as never),
    () => ({ complex: 0, real: 0, reducedEvaluations: held.reducedEvaluations }),
  );
}

async function answer(work: () => unknown, cost: () => Cost): Promise<ThreadAnswer> {
  try {
    const output = await work();
    return { output, cost: cost() };
  } catch (error) {
    if (!(error instanceof NumericalError)) throw error;
    return { refused: error.code, message: error.message, hint: error.hint };
  }
}
