import type { ModelState } from "../model/parametric-model.js";
import type { AdaptiveModel } from "../reduction/adaptive-model.js";
import { inBand } from "./band.js";
import { type DecayKind, decayOf } from "./decay.js";
import type { FullCrew } from "./full-tasks.js";
import { realDirections, type Setting } from "./measure.js";
import { findPeaks, gainFunction, peakDefaults } from "./peaks.js";
import { spectralForm } from "./spectral-form.js";

/** Full-model evaluations at places the greedy loop did not use. It gives trust, not proof. */
export interface Audit {
  readonly evaluations: number;
  /** Largest disagreement between reduced and full model, relative to the decisive value. */
  readonly worst: number;
  /** Frequencies [rad/s] looked at. */
  readonly frequencies: readonly number[];
  /** A place worse than the margin reported was met: the margin must be settled again. */
  readonly surprised: boolean;
  /** Directions that teach the reduced model the places where it disagreed. */
  readonly directions: readonly Float64Array[];
}

const leastEvaluations = 8;

/** Compares σ_max(H) of full and reduced model, relative to the decisive peak σ*, at frequencies not used so far. */
export async function auditRadius(
  crew: FullCrew,
  adaptive: AdaptiveModel,
  state: ModelState,
  setting: Setting,
  used: readonly number[],
  sigma: number,
): Promise<Audit> {
  const form = spectralForm(adaptive.reducedAt(state), setting.shift);
  const gain = gainFunction(form);
  const lowPeaks = findPeaks(form, setting.band, { ...peakDefaults, screen: 0.02, keep: 0.05 }).map(
    (peak) => peak.omega,
  );
  const count = Math.max(leastEvaluations, used.length);
  const poles = Array.from(form.kept, (j) => form.poles.im[j]);
  const frequencies = auditFrequencies(setting, used, lowPeaks, poles, count);
  const gains = await crew.run(
    "gain",
    frequencies.map((omega) => ({ state, re: 0, im: omega })),
  );
  let worst = 0;
  let surprised = false;
  const directions: Float64Array[] = [];
  for (const full of gains) {
    const disagreement = Math.abs(full.sigma - gain(full.sIm)) / sigma;
    worst = Math.max(worst, disagreement);
    if (full.sigma > sigma * (1 + 1e-9)) surprised = true;
    if (disagreement > 1e-6) directions.push(...realDirections(full.x, full.y));
  }
  return { evaluations: frequencies.length, worst, frequencies, surprised, directions };
}

/**
 * Compares eigenvalues of full and reduced model around shifts spread over the band. Only those that could
 * decide (decay at most `value + scale`) count as disagreement, which is measured in units of `scale`: the
 * decay that stands for the whole margin.
 */
export async function auditEigenvalues(
  crew: FullCrew,
  state: ModelState,
  setting: Setting,
  kind: DecayKind,
  { value, scale }: { readonly value: number; readonly scale: number },
  reduced: { readonly re: Float64Array; readonly im: Float64Array },
): Promise<Audit> {
  const poles = Array.from(reduced.im).filter((im) => inBand(setting.band, im));
  const frequencies = auditFrequencies(setting, [], [], poles, leastEvaluations);
  const areas = await crew.run(
    "neighbourhood",
    frequencies.map((omega, k) => ({ state, re: 0, im: omega, scale: setting.shift, seed: 100 + k })),
  );
  const bound = value + scale;
  let worst = 0;
  let surprised = false;
  const directions: Float64Array[] = [];
  for (const { eigenvalues } of areas) {
    for (const { re, im, right } of eigenvalues) {
      const full = decayOf(kind, re, im);
      if (im < 0 || !inBand(setting.band, im) || !(full <= bound)) continue;
      const j = nearestIndex(reduced, re, im);
      const disagreement = Math.abs(full - decayOf(kind, reduced.re[j], reduced.im[j])) / scale;
      worst = Math.max(worst, disagreement);
      // An eigenvalue on the axis scatters to both sides of it by rounding.
      if (full < value - Math.max(1e-6 * scale, 1e-10 * Math.hypot(re, im))) surprised = true;
      if (disagreement > 1e-6) directions.push(right.re, right.im);
    }
  }
  return { evaluations: frequencies.length, worst, frequencies, surprised, directions };
}

function nearestIndex(
  list: { readonly re: Float64Array; readonly im: Float64Array },
  re: number,
  im: number,
): number {
  let best = 0;
  for (let j = 1; j < list.re.length; j++) {
    if (Math.hypot(list.re[j] - re, list.im[j] - im) < Math.hypot(list.re[best] - re, list.im[best] - im))
      best = j;
  }
  return best;
}

/**
 * Lower local maxima first, then half-way (in log ω) between frequencies used, then poles of the
 * reduced model, evenly picked; each apart from those used and from each other.
 */
function auditFrequencies(
  setting: Setting,
  used: readonly number[],
  lowPeaks: readonly number[],
  poles: readonly number[],
  count: number,
): number[] {
  const top = Number.isFinite(setting.band.high) ? setting.band.high : 2 * Math.max(setting.shift, ...poles);
  const bottom = Math.max(setting.band.low, 1e-3 * top);
  const marks = [bottom, ...used.filter((omega) => omega > bottom && omega < top), top].sort((a, b) => a - b);
  const between = marks.slice(1).map((omega, k) => Math.sqrt(omega * marks[k]));
  const inside = [...new Set(poles)].filter((omega) => omega > bottom && omega < top).sort((a, b) => a - b);
  const spread = spreadOver(inside, count).map((omega) => omega * (1 + 1e-4));
  const even = Array.from({ length: count }, (_, k) => bottom * (top / bottom) ** ((k + 0.5) / count));
  const chosen: number[] = [];
  for (const omega of [...lowPeaks.slice(0, count / 2), ...between.slice(0, count / 4), ...spread, ...even]) {
    if (chosen.length >= count) break;
    if ([...used, ...chosen].every((other) => Math.abs(other - omega) > 1e-5 * omega)) chosen.push(omega);
  }
  return chosen;
}

function spreadOver(values: readonly number[], count: number): number[] {
  if (values.length <= count) return [...values];
  return Array.from({ length: count }, (_, k) => values[Math.floor(((k + 0.5) * values.length) / count)]);
}
