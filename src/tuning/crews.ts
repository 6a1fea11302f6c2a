/** Who answers the questions that threads may share: this thread alone, or a pool of others. */

import { Tinypool } from "tinypool";
import { NumericalError } from "../errors.js";
import { type FullCrew, type FullTasks, fullCrewOf } from "../margin/full-tasks.js";
import type { Crew } from "../parallel/crew.js";
import { shared } from "../parallel/share.js";
import type { Formula, Problem } from "../problem/problem.js";
import type {
  EvidenceRequest,
  FormulaStandIn,
  SearchRequest,
  ThreadAnswer,
  ThreadStart,
} from "./crew-thread.js";
import { type SearchCrew, type SearchTasks, searchCrewOf } from "./search-tasks.js";
import type { Session } from "./session.js";

export interface Crews {
  /** Independent questions to the full model. */
  readonly evidence: FullCrew;
  /** Independent searches on the reduced model as it stands. */
  readonly search: SearchCrew;
  /** Ends the threads. */
  close(): Promise<void>;
}

/** Below this order a full model answers sooner than a thread starts. */
const EVIDENCE_FROM = 2000;

export function ownCrews(session: Session): Crews {
  return {
    evidence: fullCrewOf(session.adaptive.full),
    search: searchCrewOf(session),
    close: async () => undefined,
  };
}

/** Crews of this many threads, which start with the first question. */
export function crewsOf(session: Session, threads: number): Crews {
  if (threads < 2) return ownCrews(session);
  const { adaptive } = session;
  const { full } = adaptive;
  const pool = new LazyPool(session, threads);
  const evidence = spread<FullTasks>(async (task, input) => {
    const { output, cost } = await pool.ask("evidence", { task, input });
    full.counts.complex += cost.complex;
    full.counts.real += cost.real;
    return output;
  });
  const search = spread<SearchTasks>(async (task, input) => {
    const { output, cost } = await pool.ask("search", { task, input, reduced: adaptive.snapshot() });
    session.reducedEvaluations += cost.reducedEvaluations;
    return output;
  });
  return {
    evidence: full.order < EVIDENCE_FROM ? fullCrewOf(full) : evidence,
    search,
    close: () => pool.close(),
  };
}

/** A crew that asks all its questions at once and sorts the answers by question. */
function spread<Table>(ask: (task: keyof Table & string, input: unknown) => Promise<unknown>): Crew<Table> {
  return {
    run: async (task, inputs, finished) => {
      const outputs = inputs.map(async (input) => {
        const output = await ask(String(task) as keyof Table & string, input);
        finished?.();
        return output;
      });
      return (await Promise.all(outputs)) as never;
    },
  };
}

class LazyPool {
  private readonly session: Session;
  private readonly threads: number;
  private pool: Tinypool | undefined;

  constructor(session: Session, threads: number) {
    this.session = session;
    this.threads = threads;
  }

  /** @throws NumericalError as the thread did. */
  async ask(
    entry: "evidence" | "search",
    request: EvidenceRequest | SearchRequest,
  ): Promise<Exclude<ThreadAnswer, { refused: string }>> {
    this.pool ??= this.started();
    const answer: ThreadAnswer = await this.pool.run(request, { name: entry });
    if ("refused" in answer) throw new NumericalError(answer.refused, answer.message, answer.hint);
    return answer;
  }

  async close(): Promise<void> {
    await this.pool?.destroy();
  }

  /** The model and its analysis lie in memory that all threads see. */
  private started(): Tinypool {
    const { problem, model, setting, reach, adaptive } = this.session;
    const { analysis } = adaptive.full;
    const lean: Problem = { ...problem, matrices: new Map(), perturbations: [] };
    const start: ThreadStart = { problem: lean, model, analysis, setting, reach };
    return new Tinypool({
      filename: new URL("./crew-thread.js", import.meta.url).href,
      workerData: shared(start, formulaSteps),
      minThreads: this.threads,
      maxThreads: this.threads,
      concurrentTasksPerWorker: 1,
    });
  }
}

/** Formulas hold functions, which threads cannot exchange; their steps can be. */
function formulaSteps(value: object): object | undefined {
  if (!("evaluate" in value)) return undefined;
  const { text, steps } = value as Formula;
  return { formulaText: text, formulaSteps: steps } satisfies FormulaStandIn;
}
