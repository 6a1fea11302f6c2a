import { Worker } from "node:worker_threads";
import { errorOf, isOutOfMemory, outOfMemory } from "./failure.js";
import type { CommandResult, JobDone, JobMessage, JobRequest, Opened } from "./job.js";
import type { ShowProgress } from "./progress-display.js";

/** Told while a job runs; an error thrown by one of them ends the job. */
export interface JobListener {
  readonly opened: (opened: Opened) => void;
  readonly progress: ShowProgress;
  readonly snapshot: (result: CommandResult) => void;
}

/**
 * Runs a job in a thread of its own and waits for it. Of SIGINT and SIGTERM the first one abandons the job, and
 * the caller has the rest of the two seconds in which a command must end; a second one ends the process (`main`).
 *
 * @param script - the thread's code, which sends `JobMessage`s.
 * @returns null when interrupted.
 * @throws the thread's error with its class; NumericalError `numerical.out-of-memory`.
 */
export async function supervise(
  script: URL,
  request: JobRequest,
  listener: JobListener,
): Promise<JobDone | null> {
  const worker = new Worker(script, { workerData: request });
  let interrupt: () => void = () => undefined;
  try {
    return await new Promise<JobDone | null>((resolve, reject) => {
      interrupt = () => resolve(null);
      process.once("SIGINT", interrupt).once("SIGTERM", interrupt);
      worker.on("message", (message: JobMessage) => {
        try {
          hear(message, listener, resolve);
        } catch (error) {
          reject(error);
        }
      });
      worker.on("error", (error) => reject(isOutOfMemory(error) ? outOfMemory() : error));
      worker.on("exit", (code) => reject(new Error(`the computing thread ended early with code ${code}`)));
    });
  } finally {
    process.off("SIGINT", interrupt).off("SIGTERM", interrupt);
    worker.removeAllListeners("message");
    void worker.terminate();
  }
}

function hear(message: JobMessage, listener: JobListener, resolve: (done: JobDone) => void): void {
  switch (message.type) {
    case "opened":
      listener.opened(message.opened);
      break;
    case "progress":
      listener.progress(message.progress);
      break;
    case "snapshot":
      listener.snapshot(message.result);
      break;
    case "done":
      resolve(message.done);
      break;
    case "failed":
      throw errorOf(message.failure);
  }
}
