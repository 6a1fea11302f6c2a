import { expect, it } from "vitest";
import { FullModel } from "../../src/fullorder/full-model.js";
import { statesAt } from "../../src/margin/point-margin.js";
import { type SettleOptions, settle, settleDefaults } from "../../src/margin/settle.js";
import { stateAt } from "../../src/model/parametric-model.js";
import { createRandom, type Random } from "../../src/numerics/random.js";
import { compassSearch } from "../../src/optimiser/compass-search.js";
import type { Problem } from "../../src/problem/problem.js";
import { AdaptiveModel } from "../../src/reduction/adaptive-model.js";
import { computeMargin, tuneProblem } from "../../src/tuning/commands.js";
import { Session } from "../../src/tuning/session.js";
import { ringBrakeProblem } from "./ring-brake-problem.js";

/** Designs judged; MULTISTART=20 for a trial. */
const designs = Number(process.env["MULTISTART"] ?? 500);
const context = { version: "test", progress: () => {}, snapshot: () => {} };
const loose: SettleOptions = { ...settleDefaults, tolerance: 1e-6, competing: 1 };

/**
 * One design by its own full-model margins. Its own reduced model is started at its own nominal state, so nothing
 * that the tuning has learnt can mislead it, and every value is that of full solves.
 */
class OwnJudge {
  readonly #session: Session;
  readonly #design: ReadonlyMap<string, number>;
  readonly #adaptive: AdaptiveModel;

  constructor(problem: Problem, full: FullModel, session: Session, design: ReadonlyMap<string, number>) {
    this.#session = session;
    this.#design = design;
    const start = session.valuesAt(design, session.operation.nominal);
    this.#adaptive = new AdaptiveModel(
      full,
      stateAt(full.model, start),
      2 * Math.PI * problem.margin.bandHz![1],
    );
  }

  valueAt(x: readonly number[]): number {
    const { operation, measure, setting } = this.#session;
    const values = this.#session.valuesAt(this.#design, operation.valuesOf(x));
    const settled = settle(
      this.#adaptive,
      measure,
      statesAt(this.#adaptive.full.model, values),
      setting,
      loose,
    );
    expect(settled.status).toBe("converged");
    return settled.value;
  }

  /**
   * Smallest margin over corners, mid-points and a local search from the lowest of them. A design that falls
   * below `bar` anywhere is given up with that value: it cannot be better. High friction, where most do, comes first.
   */
  worst(bar: number): number {
    const points = [1, 0.5, 0].flatMap((friction) => [1, 0, 0.5].map((pressure) => [friction, pressure]));
    let lowest = { x: points[0]!, value: Number.POSITIVE_INFINITY };
    for (const x of points) {
      const value = this.valueAt(x);
      if (value < lowest.value) lowest = { x, value };
      if (value < bar) return value;
    }
    const options = { step: 0.25, smallestStep: 0.01, maximumEvaluations: 40 };
    return compassSearch((x) => this.valueAt(x), lowest.x, lowest.value, options).value;
  }
}

it(`no one of ${designs} designs, each judged by its own full-model margins, beats the tuned one by more than 1 %`, {
  timeout: 12 * 3600_000,
}, async () => {
  const problem = await ringBrakeProblem(1000);
  const { result } = await tuneProblem(problem, {}, context);
  const tuned = result.margin.value!;
  const optimum = new Map(Object.entries(result.design));
  // The optimum anew, on a model that has learnt nothing.
  const again = await computeMargin(
    problem,
    { design: optimum, at: new Map(Object.entries(result.margin.at)) },
    context,
  );
  expect(Math.abs(again.result.margin.value! / tuned - 1)).toBeLessThan(1e-6);
  const anew = await computeMargin(problem, { design: optimum }, context);
  // The envelope is searched again from nothing; its own search ends within 4e-3 of each range.
  expect(anew.result.margin.value! / tuned).toBeGreaterThan(1 - 1e-3);

  const session = new Session(problem, optimum);
  const full = new FullModel(session.model);
  const space = session.designs;
  const random = createRandom(2024);
  const anchor = space.leastViolated(random, 2000);
  const judged: { x: readonly number[]; value: number }[] = [];
  const judge = (x: readonly number[]) => {
    expect(space.isFeasible(x)).toBe(true);
    judged.push({ x, value: new OwnJudge(problem, full, session, space.valuesOf(x)).worst(tuned) });
  };
  const around = (x: readonly number[], reach: number) => space.pullBack(nudged(x, reach, random), anchor);
  while (judged.length < 0.6 * designs) judge(space.randomFilling(random, anchor, judged.length % 2 === 0));
  const bestRandom = [...judged].sort((a, b) => b.value - a.value).slice(0, 5);
  for (let k = 0; judged.length < 0.8 * designs; k++)
    judge(around(bestRandom[k % bestRandom.length]!.x, 0.1));
  for (let k = 0; judged.length < designs; k++)
    judge(around(space.unitOf(optimum), [0.02, 0.05, 0.15][k % 3]!));

  judged.sort((a, b) => b.value - a.value);
  console.log(
    `tuned ${tuned}; the best of ${judged.length} others: ${judged.slice(0, 5).map(({ value }) => value.toFixed(5))}`,
  );
  expect(judged[0]!.value).toBeLessThan(1.01 * tuned);
});

function nudged(x: readonly number[], reach: number, random: Random): number[] {
  return x.map((xi) => Math.min(1, Math.max(0, xi + reach * (2 * random.uniform() - 1))));
}
