import { afterEach, beforeEach, describe, expect, it, vi } from "vitest";
import { NumericalError } from "../../src/errors.js";
import { stateAt } from "../../src/model/parametric-model.js";
import { crewsOf, ownCrews } from "../../src/tuning/crews.js";
import { Session } from "../../src/tuning/session.js";
import { ringBrakeProblem, stableDesign } from "../references/ring-brake-problem.js";

// A pool of one that clones whatever crosses the border, as threads would.
vi.mock("tinypool", () => {
  class Tinypool {
    static workerData: unknown;
    static started = 0;

    constructor({ workerData }: { workerData: unknown }) {
      Tinypool.workerData = structuredClone(workerData);
      Tinypool.started++;
    }

    private last: Promise<unknown> = Promise.resolve();

    run(request: unknown, { name }: { name: "evidence" | "search" }): Promise<unknown> {
      const sent = structuredClone(request);
      this.last = this.last.then(async () => {
        const thread = await import("../../src/tuning/crew-thread.js");
        const entry = thread[name] as (request: unknown) => Promise<unknown>;
        return structuredClone(await entry(sent));
      });
      return this.last;
    }

    async destroy(): Promise<void> {}
  }
  return { Tinypool };
});

const design = new Map([...stableDesign, ["layerB", 0]]);
const at = new Map([
  ["friction", 0.5],
  ["pressure", 1],
]);

beforeEach(() => vi.resetModules());
afterEach(async () => {
  const { Tinypool } = await import("tinypool");
  (Tinypool as unknown as { started: number }).started = 0;
});

describe("crews of several threads", () => {
  it("answer with the digits and the counts of this thread alone", async () => {
    const session = new Session(await ringBrakeProblem(2100), design);
    const state = stateAt(session.model, session.valuesAt(design, at));
    const shifts = [700, 800].map((omega) => ({ state, re: 0, im: omega }));
    const trials = [0.2, 0.6].map((x) => ({
      x: session.designs.variables.map(() => x),
      points: [at],
      bar: Number.NEGATIVE_INFINITY,
    }));
    const ask = async (crews: ReturnType<typeof ownCrews>) => {
      const before = { ...session.adaptive.full.counts, reduced: session.reducedEvaluations };
      const gains = await crews.evidence.run("gain", shifts);
      const found = await crews.search.run("trial", trials);
      const { complex } = session.adaptive.full.counts;
      const reduced = session.reducedEvaluations - before.reduced;
      return { gains, found, complex: complex - before.complex, reduced };
    };
    const own = await ask(ownCrews(session));
    const crews = crewsOf(session, 2);
    expect(await ask(crews)).toEqual(own);
    expect(own.complex).toBe(2);
    expect(own.reduced).toBe(2);
    await crews.close();
  });

  it("hand on what a thread refuses, with its code and its remedy", async () => {
    const session = new Session(await ringBrakeProblem(2100), design);
    const state = stateAt(session.model, session.valuesAt(design, at));
    const broken = { ...state, coefficients: state.coefficients.map(() => Number.NaN) };
    const crews = crewsOf(session, 2);
    const asked = crews.evidence.run("gain", [{ state: broken, re: 0, im: 1 }]);
    await expect(asked).rejects.toThrow(NumericalError);
    await expect(asked).rejects.toMatchObject({ code: "numerics.not-finite", exitCode: 3 });
  });

  it("start no thread before the first question", async () => {
    const session = new Session(await ringBrakeProblem(2100), design);
    const { Tinypool } = (await import("tinypool")) as unknown as { Tinypool: { started: number } };
    const crews = crewsOf(session, 2);
    await crews.close();
    expect(Tinypool.started).toBe(0);
  });
});
