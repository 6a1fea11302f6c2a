import { createRandom, type Random } from "../numerics/random.js";
import type { Candidate, ClimbOptions } from "./climb.js";
import { type EnvelopeCheck, settleAt } from "./judge.js";
import { roundToSteps } from "./rounding.js";
import { climbAll, confirmRounds, type Incumbent, type ReportBest, type RoundRecord } from "./rounds.js";
import { screen } from "./screen.js";
import type { ReportProgress, Session } from "./session.js";

export interface TuneOptions {
  readonly seed: number;
  /** Agreement wanted between reduced and full margin in a round, relative to the margin's size (`sizeOf`). */
  readonly tolerance: number;
  /** Designs screened before the first ascents. */
  readonly screened: number;
  /** Ascents in the first round. */
  readonly starts: number;
  /** Rounds of search and confirmation at most. */
  readonly rounds: number;
}

export const tuneDefaults: Omit<TuneOptions, "seed" | "tolerance"> = { screened: 160, starts: 6, rounds: 24 };

/** What the search found; its evidence is gathered afterwards. */
export interface Tuned {
  readonly best: Incumbent;
  /** No design within the limits was found; `best` is the least violated one. */
  readonly infeasible: boolean;
  /** Local optima that the starts of the first round led to on the reduced model, best first. */
  readonly starts: readonly Candidate[];
  readonly history: readonly RoundRecord[];
  readonly doubts: readonly string[];
}

const firstClimb: Omit<ClimbOptions, "tolerance"> = {
  reach: 1,
  effort: 1,
  exchanges: 3,
  frozen: new Set(),
};

/**
 * The alternating loop: search designs on the reduced model, confirm the best on the full model, learn, and
 * repeat until both agree and the design no longer gains. The optimum reported is the full model's.
 *
 * @param before - the start design's worst operating point, settled on the full model.
 *
 * Source: Aliyev, Benner, Mengi, Voigt, SIAM J. Matrix Anal. Appl. 41 (2020), reduced H∞ minimisation.
 */
export async function tune(
  session: Session,
  before: EnvelopeCheck,
  options: TuneOptions,
  progress: ReportProgress,
  reportBest: ReportBest,
): Promise<Tuned> {
  const { designs } = session;
  const random = createRandom(options.seed);
  const anchor = designs.leastViolated(random, 2000);
  if (!designs.isFeasible(anchor)) {
    const incumbent = { x: anchor, worst: before, active: [before.at] };
    return { best: incumbent, infeasible: true, starts: [], history: [], doubts: [] };
  }
  session.addExtremeSamples(designs.valuesOf(designs.start), true);
  const points = [before.at, ...session.operation.corners.map((x) => session.operation.valuesOf(x))];
  const screened = await screen(session, points, anchor, options.screened, options.starts, random, progress);
  // The best of them teaches what breaks a good design; the start design only knew what breaks a bad one.
  for (const at of points) settleAt(session, designs.valuesOf(screened[0].x), at, options.tolerance);
  const starts = await climbAll(
    session,
    screened.map(({ x }) => x),
    points,
    { ...firstClimb, tolerance: options.tolerance },
    progress,
  );
  const doubts: string[] = [];
  let { best, history, agreed } = await confirmRounds(
    session,
    starts,
    options.tolerance,
    options.rounds,
    progress,
    reportBest,
  );
  if (!agreed)
    doubts.push(
      "the search still gained, or reduced and full margin disagreed, when its rounds were used up",
    );
  if (designs.isFeasible(designs.start) && before.value > best.worst.value) {
    best = { x: designs.start, worst: before, active: [before.at] };
  }
  if (designs.isStepped) {
    const rounded = await roundToSteps(session, best, options.tolerance);
    if (rounded === undefined) doubts.push("no neighbour on the purchasable steps keeps the limits");
    best = rounded ?? best;
  }
  learnFromNeighbours(session, best, random, options.tolerance);
  return { best, infeasible: false, starts, history, doubts };
}

/** Full-model margins at two neighbouring designs: where the reduced model was wrong there, it learns. */
function learnFromNeighbours(
  session: Session,
  { x, worst }: Incumbent,
  random: Random,
  tolerance: number,
): void {
  const { designs } = session;
  for (let k = 0; k < 2; k++) {
    const shifted = x.map((xi) => Math.min(1, Math.max(0, xi + 0.05 * (2 * random.uniform() - 1))));
    const neighbour = designs.pullBack(shifted, x);
    settleAt(session, designs.valuesOf(neighbour), worst.at, tolerance);
  }
}
