import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, afterEach, describe, expect, it, vi } from "vitest";
import { errorOf, failureOf } from "../../src/cli/failure.js";
import type { JobRequest } from "../../src/cli/job.js";
import { runJob } from "../../src/cli/run-job.js";
import { supervise } from "../../src/cli/supervise.js";
import { ExpectedError, InputError, NumericalError } from "../../src/errors.js";
import { marginCase } from "./report-cases.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-run-"));
afterAll(() => rmSync(folder, { recursive: true }));
afterEach(() => vi.restoreAllMocks());

/** A thread that runs `code` with `send(message)` at hand. */
const thread = (code: string) =>
  new URL(
    `data:text/javascript,${encodeURIComponent(
      `import { parentPort } from "node:worker_threads"; const send = (m) => parentPort.postMessage(m); ${code}`,
    )}`,
  );
const endless = "for (;;) {}";
const request: JobRequest = {
  command: "margin",
  problem: "brake.json",
  version: "1",
  design: [],
  at: [],
  seed: null,
  threads: 1,
};
const deaf = { opened: () => undefined, progress: () => undefined, snapshot: () => undefined };
const listeners = () => process.listenerCount("SIGINT") + process.listenerCount("SIGTERM");

describe("a job in a thread", () => {
  it("hands on what the thread says and returns its answer", async () => {
    const heard: unknown[] = [];
    const code = `send({ type: "progress", progress: 7 }); send({ type: "snapshot", result: 8 }); send({ type: "done", done: 9 });`;
    const before = listeners();
    const done = await supervise(thread(code), request, {
      ...deaf,
      progress: (progress) => heard.push(progress),
      snapshot: (result) => heard.push(result),
    });
    expect([...heard, done]).toEqual([7, 8, 9]);
    expect(listeners()).toBe(before);
  });

  it("keeps class, code and hint of an error", async () => {
    const faults = [{ code: "input.some", at: "a", message: "b", hint: "c" }];
    const errors = [
      new InputError(faults),
      new NumericalError("numerical.some", "m", "h"),
      new ExpectedError("other.some", "m", "h", 2),
    ];
    for (const error of errors) {
      const code = `send({ type: "failed", failure: ${JSON.stringify(failureOf(error))} });`;
      const met = await supervise(thread(code), request, deaf).catch((thrown: unknown) => thrown);
      expect(met).toBeInstanceOf(error.constructor);
      expect(met).toMatchObject({ code: error.code, hint: error.hint, exitCode: error.exitCode });
    }
  });

  it("that crashes, ends early or sends a bug is no error of the user", async () => {
    const failure = JSON.stringify({ type: "failed", failure: failureOf(5) });
    for (const code of ["throw new TypeError('broken')", "process.exit(0)", `send(${failure})`]) {
      const met = await supervise(thread(code), request, deaf).catch((thrown: unknown) => thrown);
      expect(met).toBeInstanceOf(Error);
      expect(met).not.toBeInstanceOf(ExpectedError);
    }
  });

  it("ends with an error of its listener", async () => {
    const refuse = () => {
      throw InputError.of("output.unwritable", "a", "b", "c");
    };
    const code = `send({ type: "opened", opened: {} }); ${endless}`;
    await expect(supervise(thread(code), request, { ...deaf, opened: refuse })).rejects.toMatchObject({
      code: "output.unwritable",
    });
  });

  it("is abandoned at the first signal, however busy it is", async () => {
    for (const signal of ["SIGINT", "SIGTERM"] as const) {
      const code = `send({ type: "progress", progress: {} }); ${endless}`;
      const progress = () => process.emit(signal);
      expect(await supervise(thread(code), request, { ...deaf, progress })).toBeNull();
    }
  });
});

describe("failures", () => {
  it("for want of memory are told from bugs", () => {
    const full = Object.assign(new Error("limit"), { code: "ERR_WORKER_OUT_OF_MEMORY" });
    for (const error of [full, new RangeError("Array buffer allocation failed")]) {
      expect(errorOf(failureOf(error))).toMatchObject({ code: "numerical.out-of-memory", exitCode: 3 });
    }
    expect(failureOf(new RangeError("Invalid array length")).kind).toBe("bug");
  });

  it("of our own keep the stack of the thread", () => {
    const error = new TypeError("broken");
    expect(errorOf(failureOf(error)).stack).toBe(error.stack);
  });
});

describe("an interrupted run", () => {
  const output = { json: true, quiet: false, out: join(folder, "out"), vectors: undefined };
  const written = () => JSON.parse(readFileSync(join(folder, "out", "result.json"), "utf8"));
  const opened = { title: "Brake", inputs: marginCase.inputs };

  /** Runs a thread that opens the problem and works on for ever; a signal comes with the first line of progress. */
  async function interrupted(messages: string): Promise<{ status: number; printed: string }> {
    const said = vi.spyOn(process.stdout, "write").mockImplementation((_text, ended) => {
      if (typeof ended === "function") (ended as () => void)();
      return true;
    });
    const opening = `send({ type: "opened", opened: ${JSON.stringify(opened)} });`;
    const progress = `send({ type: "progress", progress: { stage: "working", done: 0, total: null } });`;
    vi.spyOn(process.stderr, "write").mockImplementation(() => process.emit("SIGINT"));
    const status = await runJob(request, output, thread(`${opening} ${messages} ${progress} ${endless}`));
    return { status, printed: String(said.mock.calls.at(-1)?.[0]) };
  }

  it("leaves the best answer so far", async () => {
    const { status, printed } = await interrupted(
      `send({ type: "snapshot", result: ${JSON.stringify(marginCase)} });`,
    );
    expect(status).toBe(130);
    expect(written()).toEqual({ ...marginCase, status: "interrupted" });
    expect(JSON.parse(printed)).toEqual(written());
  });

  it("says what it was about when there is no answer yet", async () => {
    const { status } = await interrupted("");
    expect(status).toBe(130);
    expect(written()).toEqual({
      format: "dampwright-result/1",
      command: "margin",
      version: "1",
      title: "Brake",
      status: "interrupted",
      inputs: marginCase.inputs,
    });
  });
});
