import { sizeOf } from "../margin/measure.js";
import { marginAt, type PointMargin, provisionalMargin, statesAt } from "../margin/point-margin.js";
import { type Settled, settle, settleDefaults } from "../margin/settle.js";
import type { Resolution } from "./operating-space.js";
import type { ReportProgress, Session } from "./session.js";

/** Another operating point that the full model was asked about. */
export interface EnvelopeCheck {
  readonly at: ReadonlyMap<string, number>;
  readonly value: number;
}

/** The smallest margin of one design over the envelope, settled on the full model. */
export interface Judgement {
  readonly at: ReadonlyMap<string, number>;
  readonly point: PointMargin;
  /** Full-model margins at other operating points, worst first. */
  readonly envelope: readonly EnvelopeCheck[];
  readonly doubts: readonly string[];
}

const mostRounds = 8;

/**
 * Judges a design: worst operating point by the reduced model, settled on the full model and learnt from, until the worst
 * point stands still; then evidence there and full-model checks at the other low points and corners of the envelope.
 *
 * @param fixed - the operating point to judge at; undefined searches the envelope.
 */
export async function judge(
  session: Session,
  design: ReadonlyMap<string, number>,
  fixed: ReadonlyMap<string, number> | undefined,
  known: readonly ReadonlyMap<string, number>[],
  progress: ReportProgress,
): Promise<Judgement> {
  const { adaptive, measure, setting } = session;
  const { at, checks } =
    fixed === undefined ? worstOfEnvelope(session, design, known, progress) : { at: fixed, checks: [] };
  progress({ stage: "gathering evidence", done: 0, total: null });
  const values = session.valuesAt(design, at);
  const point = await marginAt(adaptive, measure, values, setting, settleDefaults, session.crews.evidence);
  const worse = checks.some((check) => check.value < point.value - 1e-6 * Math.max(1, Math.abs(point.value)));
  const doubts = worse ? [...point.doubts, "a lower margin was met elsewhere in the envelope"] : point.doubts;
  return { at, point, envelope: checks, doubts };
}

/** The worst operating point, searched again as long as a full-model check elsewhere finds a lower margin. */
function worstOfEnvelope(
  session: Session,
  design: ReadonlyMap<string, number>,
  known: readonly ReadonlyMap<string, number>[],
  progress: ReportProgress,
): { at: ReadonlyMap<string, number>; checks: readonly EnvelopeCheck[] } {
  let checks: readonly EnvelopeCheck[] = [];
  for (let round = 0; ; round++) {
    progress({ stage: "settling the worst operating point", done: round, total: null });
    const points = [...known, ...checks.map((check) => check.at)];
    const { at, value } = settledWorst(session, design, points, "fine", 1e-6, checks[0]?.at);
    progress({ stage: "checking the envelope", done: round, total: null });
    checks = checkEnvelope(session, design, at);
    const slack = 1e-6 * Math.max(1, Math.abs(value));
    if (round === mostRounds || checks.every((check) => check.value >= value - slack)) return { at, checks };
  }
}

/** A judgement without its evidence, for a search that may be interrupted: value and place only. */
export function provisional(
  session: Session,
  design: ReadonlyMap<string, number>,
  at: ReadonlyMap<string, number>,
): Judgement {
  const point = provisionalMargin(
    session.adaptive,
    session.measure,
    session.valuesAt(design, at),
    session.setting,
  );
  return { at, point, envelope: [], doubts: point.doubts };
}

/** Full-model margin at one operating point to a loose tolerance; only the most critical place is examined. */
export function settleAt(
  session: Session,
  design: ReadonlyMap<string, number>,
  at: ReadonlyMap<string, number>,
  tolerance: number,
): Settled {
  const states = statesAt(session.model, session.valuesAt(design, at));
  return settle(session.adaptive, session.measure, states, session.setting, {
    ...settleDefaults,
    tolerance,
    competing: 1,
  });
}

/**
 * Worst operating point on which the reduced and the full model agree.
 *
 * @param rival - a point that the full model has found low: it stands against what the reduced model finds, whose
 * word can be off by more than two nearly equal minima lie apart.
 */
export function settledWorst(
  session: Session,
  design: ReadonlyMap<string, number>,
  known: readonly ReadonlyMap<string, number>[],
  resolution: Resolution = "fine",
  tolerance = 1e-6,
  rival?: ReadonlyMap<string, number>,
): EnvelopeCheck {
  const visited: ReadonlyMap<string, number>[] = rival === undefined ? [] : [rival];
  let best: EnvelopeCheck | undefined =
    rival === undefined ? undefined : { at: rival, value: settleAt(session, design, rival, tolerance).value };
  for (let round = 0; round < mostRounds; round++) {
    const low =
      best === undefined
        ? session.worstPoints(design, known, resolution)
        : session.worstPoints(design, [...known, ...visited], "local");
    const found = low.find(({ at }) => visited.every((other) => !samePoint(session, other, at, 1e-9)));
    if (found === undefined) break;
    const slack = tolerance * sizeOf(found.value, session.setting);
    if (best !== undefined && found.value >= best.value - slack) break;
    const { value } = settleAt(session, design, found.at, tolerance);
    visited.push(found.at);
    if (best === undefined || value < best.value) best = { at: found.at, value };
    if (Math.abs(value - found.value) <= slack) break;
  }
  if (best === undefined) throw new Error("the search over the envelope made no round");
  return best;
}

/** Full-model margins at the reduced model's other low points and at up to four corners. */
function checkEnvelope(
  session: Session,
  design: ReadonlyMap<string, number>,
  worst: ReadonlyMap<string, number>,
): EnvelopeCheck[] {
  if (session.operation.parameters.length === 0) return [];
  const low = session.worstPoints(design, [worst], "coarse").map((point) => point.at);
  const corners = session.operation.corners.map((x) => session.operation.valuesOf(x));
  const ranked = corners
    .map((at) => ({ at, value: session.estimate(design, at).value }))
    .sort((a, b) => a.value - b.value)
    .slice(0, 4)
    .map(({ at }) => at);
  const chosen: ReadonlyMap<string, number>[] = [];
  for (const at of [...low, ...ranked]) {
    if ([worst, ...chosen].every((other) => !samePoint(session, at, other))) chosen.push(at);
  }
  return chosen
    .map((at) => ({ at, value: settleAt(session, design, at, 1e-4).value }))
    .sort((a, b) => a.value - b.value);
}

function samePoint(
  session: Session,
  a: ReadonlyMap<string, number>,
  b: ReadonlyMap<string, number>,
  within = 1e-3,
): boolean {
  const [x, y] = [session.operation.unitOf(a), session.operation.unitOf(b)];
  return x.every((xi, i) => Math.abs(xi - y[i]) < within);
}
