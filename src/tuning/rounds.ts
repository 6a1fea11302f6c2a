import { sizeOf } from "../margin/measure.js";
import type { Climbed, ClimbOptions } from "./climb.js";
import { type EnvelopeCheck, settledWorst } from "./judge.js";
import type { ReportProgress, Session } from "./session.js";

/** One round: what the reduced model promised and what the full model said. */
export interface RoundRecord {
  readonly round: number;
  readonly design: ReadonlyMap<string, number>;
  readonly at: ReadonlyMap<string, number>;
  readonly reduced: number;
  readonly full: number;
  readonly factorisations: number;
  readonly reducedOrder: number;
}

/** The best design that the full model has confirmed. */
export interface Incumbent {
  readonly x: readonly number[];
  readonly worst: EnvelopeCheck;
  readonly active: readonly ReadonlyMap<string, number>[];
}

export interface Rounds {
  readonly best: Incumbent;
  readonly history: readonly RoundRecord[];
  /** The reduced model promises no gain beyond the tolerance over what the full model confirmed. */
  readonly agreed: boolean;
}

/** Called whenever a better design has been confirmed on the full model. */
export type ReportBest = (design: ReadonlyMap<string, number>, worst: EnvelopeCheck) => void;

const laterClimb: Omit<ClimbOptions, "tolerance"> = {
  reach: 0.15,
  effort: 0.65,
  exchanges: 3,
  frozen: new Set(),
};

/** Ascents from several starts, best first. */
export async function climbAll(
  session: Session,
  starts: readonly (readonly number[])[],
  active: readonly ReadonlyMap<string, number>[],
  options: ClimbOptions,
  progress: ReportProgress,
): Promise<Climbed[]> {
  let done = 0;
  const tell = () => progress({ stage: "climbing on the reduced model", done, total: starts.length });
  tell();
  const inputs = starts.map((start) => ({ start, active, options }));
  const found = await session.crews.search.run("climb", inputs, () => {
    done++;
    tell();
  });
  return found.sort((a, b) => b.value - a.value);
}

/**
 * Confirms the best candidate on the full model, lets the reduced model learn from it, climbs again from
 * there and from the runners-up, until the reduced model promises nothing more.
 */
export async function confirmRounds(
  session: Session,
  climbed: readonly Climbed[],
  tolerance: number,
  rounds: number,
  progress: ReportProgress,
  reportBest: ReportBest,
): Promise<Rounds> {
  const { designs, adaptive } = session;
  const history: RoundRecord[] = [];
  let pool = climbed;
  let best: Incumbent | undefined;
  let { reach } = laterClimb;
  for (let round = 0; round < rounds; round++) {
    const top = pool[0];
    const slack = tolerance * sizeOf(top.value, session.setting);
    if (best !== undefined && top.value <= best.worst.value + slack) return { best, history, agreed: true };
    progress({ stage: "confirming on the full model", done: round, total: rounds });
    const design = designs.valuesOf(top.x);
    const worst = settledWorst(session, design, top.active, "coarse", tolerance);
    const { complex, real } = adaptive.full.counts;
    history.push({
      round,
      design,
      at: worst.at,
      reduced: top.value,
      full: worst.value,
      factorisations: complex + real,
      reducedOrder: adaptive.order,
    });
    const active = withPoint(session, top.active, worst.at);
    if (best === undefined || worst.value > best.worst.value) {
      best = { x: top.x, worst, active };
      reportBest(design, worst);
    }
    const others = pool.slice(1, 2).map((candidate) => candidate.x);
    const next = [best.x, ...(top.x === best.x ? [] : [top.x]), ...others];
    pool = await climbAll(session, next, active, { ...laterClimb, reach, tolerance }, progress);
    // An ascent that ends on the edge of its box had further to go.
    if (next.some((x) => distance(x, pool[0].x) > 0.9 * reach)) reach = Math.min(1, 2 * reach);
  }
  if (best === undefined) throw new Error("tuning made no round");
  return { best, history, agreed: false };
}

function distance(a: readonly number[], b: readonly number[]): number {
  return Math.max(...a.map((value, i) => Math.abs(value - b[i])));
}

function withPoint(
  session: Session,
  points: readonly ReadonlyMap<string, number>[],
  at: ReadonlyMap<string, number>,
): ReadonlyMap<string, number>[] {
  const u = session.operation.unitOf(at);
  const apart = (other: ReadonlyMap<string, number>) =>
    session.operation.unitOf(other).some((value, i) => Math.abs(value - u[i]) > 0.02);
  return [at, ...points.filter(apart)].slice(0, 6);
}
