import type { DensePencil } from "../reduction/reduced-model.js";
import { levelCrossings } from "./level-set.js";
import type { Setting } from "./measure.js";
import { gainFunction } from "./peaks.js";
import { polishPeak } from "./polish-peak.js";
import { spectralForm } from "./spectral-form.js";

/**
 * Level-set test on a reduced model: frequencies of local maxima above `sigma` that the search by poles did not
 * see. Between neighbouring crossings of a level slightly above `sigma` the gain is sampled, so a
 * crossing that rounding pushed off the axis does no harm.
 */
export function missedPeaks(pencil: DensePencil, setting: Setting, sigma: number): number[] {
  const level = sigma * (1 + 1e-6);
  const crossings = levelCrossings(pencil, level, setting.shift, setting.band);
  if (crossings.length === 0) return [];
  const gain = gainFunction(spectralForm(pencil, setting.shift));
  const top = Number.isFinite(setting.band.high) ? setting.band.high : 2 * crossings[crossings.length - 1];
  const marks = [setting.band.low, ...crossings, top];
  const missed: number[] = [];
  for (let k = 0; k + 1 < marks.length; k++) {
    const middle = 0.5 * (marks[k] + marks[k + 1]);
    const value = gain(middle);
    if (value > level) missed.push(polishPeak(gain, marks[k], middle, marks[k + 1], value).omega);
  }
  return missed;
}
