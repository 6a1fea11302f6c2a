import type { ModelState, ParametricModel, Values } from "../model/parametric-model.js";
import { stateAt } from "../model/parametric-model.js";
import type { MarginSettings } from "../problem/problem.js";
import type { AdaptiveModel } from "../reduction/adaptive-model.js";
import { type Audit, auditEigenvalues, auditRadius } from "./audit.js";
import { bandOf } from "./band.js";
import { decay } from "./decay.js";
import { eigenvalueList, judgeStability, type StabilityVerdict, verdictOf } from "./full-stability.js";
import { type FullCrew, fullCrewOf } from "./full-tasks.js";
import { type Checked, type Measure, type Setting, sizeOf } from "./measure.js";
import { missedPeaks } from "./missed-peaks.js";
import { multiplier } from "./multiplier.js";
import { peakDefaults } from "./peaks.js";
import { radius } from "./radius.js";
import { type Settled, type SettleOptions, settle, settleDefaults } from "./settle.js";
import { type Witness, witnessOf } from "./witness.js";

/** A margin at one design and operating point with its evidence, all of it from the full model. */
export interface PointMargin {
  readonly measure: Measure["name"];
  /** Infinity when there is no limit. */
  readonly value: number;
  /** [low, high]: the witness proves the high end, the audit supports the low one. */
  readonly between: readonly [number, number];
  /** [rad/s]; null when nothing breaks. */
  readonly omega: number | null;
  readonly loss: "flutter" | "divergence" | null;
  readonly decisive: Checked | undefined;
  readonly stability: StabilityVerdict;
  readonly witness: Witness | undefined;
  readonly audit: Audit;
  readonly settled: Settled;
  /** Level-set test on the reduced model: done, and clean. */
  readonly levelSetClean: boolean;
  /** Why the numbers are not to be trusted; empty when they are. */
  readonly doubts: readonly string[];
}

/** The measure that a problem's settings name. */
export function measureOf(settings: MarginSettings): Measure {
  if (settings.measure === "radius") return radius;
  return settings.measure === "multiplier" ? multiplier : decay(settings.as);
}

export function settingOf(settings: MarginSettings, adaptive: AdaptiveModel): Setting {
  const band = bandOf(settings.bandHz);
  const searched = Number.isFinite(band.high) ? band : { low: band.low, high: adaptive.searchedTo };
  const omegaRef = Number.isFinite(searched.high) ? searched.high : adaptive.shift;
  const unit = Math.abs(settings.target ?? 0) || unitOf(settings, omegaRef);
  return { band: searched, shift: adaptive.shift, omegaRef, unit, peaks: peakDefaults };
}

/** Without a target: what was declared for a radius or multiplier, a damping ratio of one per cent for a decay. */
function unitOf({ measure, as }: MarginSettings, omegaRef: number): number {
  if (measure !== "decay") return 1;
  return { ratio: 0.01, logDecrement: 0.02 * Math.PI, rate: 0.01 * omegaRef }[as];
}

/** The states along the multiplier at one point. */
export function statesAt(model: ParametricModel, values: Values): (multiplier: number) => ModelState {
  return (factor) => stateAt(model, values, factor);
}

/** How often the loop starts again after stability, level sets or the audit have found something new. */
const mostRestarts = 6;

/** Disagreement of the audit, relative to the margin, from which on the loop learns from it. */
const roughAudit = 1e-3;

/** Settles the margin at one point and gathers its evidence; see `DEVELOPERS.md`, Evidence. */
export async function marginAt(
  adaptive: AdaptiveModel,
  measure: Measure,
  values: Values,
  setting: Setting,
  options: SettleOptions = settleDefaults,
  crew: FullCrew = fullCrewOf(adaptive.full),
): Promise<PointMargin> {
  const states = statesAt(adaptive.full.model, values);
  let hints: readonly number[] = [];
  for (let restart = 0; ; restart++) {
    const here = { ...setting, peaks: { ...setting.peaks, extra: hints } };
    const settled = settle(adaptive, measure, states, here, options);
    const stability = await judgeStability(
      crew,
      adaptive,
      states(1),
      here,
      reducedEigenvalues(adaptive, states(1), here),
    );
    const missed = missedOnReduced(adaptive, measure, states(1), here, settled);
    const audit = await auditOf(crew, adaptive, measure, states, here, settled);
    const news = [...stability.missed.flatMap(({ right }) => [right.re, right.im]), ...audit.directions];
    // A rough disagreement is a sample to learn from once; after that it stands in the lower end.
    const rough = audit.worst > roughAudit && restart === 0;
    const settledForGood = stability.missed.length === 0 && missed.length === 0 && !audit.surprised && !rough;
    if (settledForGood || restart === mostRestarts) {
      return assemble(adaptive, measure, states, here, { settled, stability, audit, missed });
    }
    const before = adaptive.order;
    adaptive.enrich(news);
    if (adaptive.order === before && missed.length === 0) {
      return assemble(adaptive, measure, states, here, { settled, stability, audit, missed });
    }
    hints = [...hints, ...missed];
  }
}

/** The margin at one point settled loosely, with the reduced model's word on stability and no audit. */
export function provisionalMargin(
  adaptive: AdaptiveModel,
  measure: Measure,
  values: Values,
  setting: Setting,
): PointMargin {
  const states = statesAt(adaptive.full.model, values);
  const settled = settle(adaptive, measure, states, setting, {
    ...settleDefaults,
    tolerance: 1e-3,
    competing: 1,
  });
  const stability = verdictOf(eigenvalueList(settled.estimate.eigenvalues), [], setting, 0, 0);
  const audit: Audit = { evaluations: 0, worst: 0, frequencies: [], surprised: false, directions: [] };
  const point = assemble(adaptive, measure, states, setting, { settled, stability, audit, missed: [] });
  return { ...point, doubts: [...point.doubts, "no evidence was gathered yet"] };
}

interface Findings {
  readonly settled: Settled;
  readonly stability: StabilityVerdict;
  readonly audit: Audit;
  readonly missed: readonly number[];
}

function reducedEigenvalues(adaptive: AdaptiveModel, state: ModelState, setting: Setting) {
  return decay("rate").estimate(() => adaptive.reducedAt(state), setting).eigenvalues;
}

function missedOnReduced(
  adaptive: AdaptiveModel,
  measure: Measure,
  state: ModelState,
  setting: Setting,
  { decisive }: Settled,
): number[] {
  if (measure.name !== "radius" || decisive?.found.kind !== "peak" || decisive.value === 0) return [];
  return missedPeaks(adaptive.reducedAt(state), setting, decisive.found.gain.sigma);
}

async function auditOf(
  crew: FullCrew,
  adaptive: AdaptiveModel,
  measure: Measure,
  states: (multiplier: number) => ModelState,
  setting: Setting,
  settled: Settled,
): Promise<Audit> {
  const { decisive, value, records } = settled;
  if (decisive?.found.kind === "peak") {
    const used = records.map((record) => record.omega);
    return auditRadius(crew, adaptive, states(1), setting, used, decisive.found.gain.sigma);
  }
  // Of a multiplier the audit looks at the model just where it is said to lose stability.
  const state = states(measure.name === "multiplier" && Number.isFinite(value) ? value : 1);
  const { value: slowest, eigenvalues } = decay("rate").estimate(() => adaptive.reducedAt(state), setting);
  const drift = decisive?.found.kind === "crossing" ? Math.abs(decisive.found.crossing.drift * value) : 0;
  const scale = Math.max(Math.abs(slowest), drift, 1e-9 * setting.shift);
  return auditEigenvalues(crew, state, setting, "rate", { value: slowest, scale }, eigenvalues);
}

function assemble(
  adaptive: AdaptiveModel,
  measure: Measure,
  states: (multiplier: number) => ModelState,
  setting: Setting,
  { settled, stability, audit, missed }: Findings,
): PointMargin {
  const { decisive, value } = settled;
  const witness = decisive === undefined ? undefined : witnessOf(adaptive.full.pencilAt(states(1)), decisive);
  const slack = Math.abs(value) * audit.worst + 1e-9 * sizeOf(value, setting);
  const low = Number.isFinite(value) ? value - slack : value;
  const omega = decisive?.omega ?? null;
  return {
    measure: measure.name,
    value,
    between: [low, value],
    omega,
    loss: omega === null ? null : omega > 1e-6 * setting.shift ? "flutter" : "divergence",
    decisive,
    stability,
    witness,
    audit,
    settled,
    levelSetClean: missed.length === 0,
    doubts: doubtsOf(adaptive, measure, { settled, stability, audit, missed }, witness),
  };
}

function doubtsOf(
  adaptive: AdaptiveModel,
  measure: Measure,
  { settled, stability, audit, missed }: Findings,
  witness: Witness | undefined,
): string[] {
  const doubts: string[] = [];
  const unstable = stability.unstable > 0;
  if (settled.status === "stalled") doubts.push("the reduced and the full model did not come to agree");
  if (missed.length > 0) doubts.push("the level-set test still finds a higher peak");
  if (stability.missed.length > 0)
    doubts.push("the full model has unstable eigenvalues that the reduced one lacks");
  if (stability.open > 0)
    doubts.push(`${stability.open} stretches of the axis could not be searched for unstable eigenvalues`);
  if (audit.surprised) doubts.push("the audit met a place worse than the margin reported");
  if (witness !== undefined && !(witness.residual < 1e-8))
    doubts.push("the witness does not make the full model singular");
  if (adaptive.modeCounts.some((modes) => !modes.complete))
    doubts.push("the real modes of a start sample are not complete");
  const contradicts =
    (measure.name === "radius" && settled.value < 0 !== unstable) ||
    (measure.name === "multiplier" && unstable && settled.value > 1);
  if (contradicts)
    doubts.push("the sign of the margin and the eigenvalues of the full model contradict each other");
  return doubts;
}
