/** Who answers the questions that threads may share: this thread alone, or a pool of others. */

import { Tinypool } from "tinypool";
import { NumericalError } from "../errors.js";
import { type FullCrew, type FullTasks, fullCrewOf } from "../margin/full-tasks.js";
import { shared } from "../parallel/share.js";
import type { Formula } from "../problem/problem.js";
import type { ThreadAnswer, ThreadRequest, ThreadStart } from "./crew-thread.js";
import type { Session } from "./session.js";

export interface Crews {
  readonly evidence: FullCrew;
  /** Ends the threads. */
  close(): Promise<void>;
}

/** Below this order starting threads costs more than they save. */
const THREADED_FROM = 2000;

export function ownCrews(session: Session): Crews {
  return { evidence: fullCrewOf(session.adaptive.full), close: async () => undefined };
}

/**
 * Crews of this many threads for a session whose model is worth it. The model and its analysis lie in memory
 * that all threads see.
 */
export function crewsOf(session: Session, threads: number): Crews {
  const { full } = session.adaptive;
  if (threads < 2 || full.order < THREADED_FROM) return ownCrews(session);
  const start: ThreadStart = shared({ model: full.model, analysis: full.analysis }, formulaSteps);
  const pool = new Tinypool({
    filename: new URL("./crew-thread.js", import.meta.url).href,
    workerData: start,
    minThreads: threads,
    maxThreads: threads,
    concurrentTasksPerWorker: 1,
    idleTimeout: 0,
  });
  const ask = async (task: keyof FullTasks & string, input: unknown): Promise<unknown> => {
    const request: ThreadRequest = { task, input };
    const answer: ThreadAnswer = await pool.run(request, { name: "evidence" });
    if ("refused" in answer) throw new NumericalError(answer.refused, answer.message, answer.hint);
    full.counts.complex += answer.counts.complex;
    full.counts.real += answer.counts.real;
    return answer.output;
  };
  const evidence: FullCrew = {
    run: async (task, inputs, finished) => {
      const outputs = inputs.map(async (input) => {
        const output = await ask(String(task), input);
        finished?.();
        return output;
      });
      return (await Promise.all(outputs)) as never;
    },
  };
  return { evidence, close: () => pool.destroy() };
}

/** Formulas hold functions, which threads cannot exchange; their steps can be. */
function formulaSteps(value: object): object | undefined {
  if (!("evaluate" in value)) return undefined;
  const { text, steps } = value as Formula;
  return { formula: { text, steps } };
}
