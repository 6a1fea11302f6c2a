import type { Random } from "../numerics/random.js";
import type { Candidate } from "./climb.js";
import type { ReportProgress, Session } from "./session.js";

/** Designs tried against the same bar: enough for some threads, few enough that the bar rises soon. */
const BATCH = 8;

/**
 * Seeded random designs that fill the budget, every other one with few treatments only, beside the start
 * design, ranked by their worst reduced margin over the given operating points. A design is given up
 * at the first operating point that puts it below the `keep` best so far.
 */
export async function screen(
  session: Session,
  points: readonly ReadonlyMap<string, number>[],
  anchor: readonly number[],
  count: number,
  keep: number,
  random: Random,
  progress: ReportProgress,
): Promise<Candidate[]> {
  const { designs } = session;
  const best: Candidate[] = [];
  const order = [...points];
  const trials = [designs.pullBack(designs.start, anchor)];
  while (trials.length < count) trials.push(designs.randomFilling(random, anchor, trials.length % 2 === 0));
  const bar = (): number => (best.length < keep ? Number.NEGATIVE_INFINITY : best[best.length - 1].value);
  for (let first = 0; first < count; first += BATCH) {
    progress({ stage: "screening designs on the reduced model", done: first, total: count });
    const batch = trials.slice(first, first + BATCH);
    const asked = [...order];
    const found = await session.crews.search.run(
      "trial",
      batch.map((x) => ({ x, points: asked, bar: bar() })),
    );
    found.forEach(({ value, failedAt }, k) => {
      // The point that decided is asked first from now on.
      if (failedAt !== null) order.unshift(...order.splice(order.indexOf(asked[failedAt]), 1));
      const x = batch[k];
      if (value <= bar() || best.some((other) => distance(other.x, x) < 0.05)) return;
      best.push({ x, value });
      best.sort((a, b) => b.value - a.value);
      best.length = Math.min(best.length, keep);
    });
  }
  return best;
}

function distance(a: readonly number[], b: readonly number[]): number {
  return Math.max(...a.map((value, i) => Math.abs(value - b[i])));
}
