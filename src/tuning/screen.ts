import type { Random } from "../numerics/random.js";
import type { Candidate } from "./climb.js";
import type { ReportProgress, Session } from "./session.js";

/**
 * Seeded random designs that fill the budget, every other one with few treatments only, beside the start
 * design, ranked by their worst reduced margin over the given operating points. A design is given up
 * at the first operating point that puts it below the `keep` best so far.
 */
export function screen(
  session: Session,
  points: readonly ReadonlyMap<string, number>[],
  anchor: readonly number[],
  count: number,
  keep: number,
  random: Random,
  progress: ReportProgress,
): Candidate[] {
  const { designs } = session;
  const best: Candidate[] = [];
  const order = [...points];
  const trials = [designs.pullBack(designs.start, anchor)];
  while (trials.length < count) trials.push(designs.randomFilling(random, anchor, trials.length % 2 === 0));
  trials.forEach((x, k) => {
    progress({ stage: "screening designs on the reduced model", done: k, total: count });
    const bar = best.length < keep ? Number.NEGATIVE_INFINITY : best[best.length - 1].value;
    const value = worstAbove(session, x, order, bar);
    if (value <= bar || best.some((other) => distance(other.x, x) < 0.05)) return;
    best.push({ x, value });
    best.sort((a, b) => b.value - a.value);
    best.length = Math.min(best.length, keep);
  });
  return best;
}

/** Smallest margin over the points, or the first one found at or below `bar`; the deciding point moves to the front. */
function worstAbove(
  session: Session,
  x: readonly number[],
  order: ReadonlyMap<string, number>[],
  bar: number,
): number {
  const design = session.designs.valuesOf(x);
  let worst = Number.POSITIVE_INFINITY;
  for (let k = 0; k < order.length; k++) {
    worst = Math.min(worst, session.estimate(design, order[k]).value);
    if (worst > bar) continue;
    order.unshift(...order.splice(k, 1));
    break;
  }
  return worst;
}

function distance(a: readonly number[], b: readonly number[]): number {
  return Math.max(...a.map((value, i) => Math.abs(value - b[i])));
}
