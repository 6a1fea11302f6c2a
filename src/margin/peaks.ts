import { type ComplexMatrix, complexZeros } from "../numerics/dense/matrix.js";
import { largestSingularValue } from "../numerics/dense/svd.js";
import type { Band } from "./band.js";
import type { SpectralForm } from "./spectral-form.js";
import { ownPeak, transferInto } from "./spectral-form.js";

/** A local maximum of σ_max(H(iω)) over the band. */
export interface Peak {
  /** [rad/s] */
  readonly omega: number;
  readonly sigma: number;
}

export interface PeakOptions {
  /** Poles whose own peak is below this share of the highest are not polished. Default 0.2. */
  readonly screen: number;
  /** Peaks below this share of the highest are not reported. Default 0.5. */
  readonly keep: number;
  /** Further start frequencies [rad/s]. Default none. */
  readonly extra: readonly number[];
  /** Relative accuracy of a peak's frequency. Default 1e-9; its height is then exact to rounding unless ζ is tiny. */
  readonly accuracy: number;
}

export const peakDefaults: PeakOptions = { screen: 0.2, keep: 0.5, extra: [], accuracy: 1e-9 };

/** σ_max(H(iω)) as a function; owns its workspace. */
export function gainFunction(form: SpectralForm): (omega: number) => number {
  const h: ComplexMatrix = complexZeros(form.outputs, form.inputs);
  return (omega) => {
    transferInto(h, form, omega);
    return largestSingularValue(h);
  };
}

/**
 * Competing maxima of σ_max(H(iω)) in the band, highest first: start points at every pole that
 * matters, at the band's ends and half-way between neighbours, each polished to a local maximum.
 * ω = 0 is a start point whenever the band holds it. The level-set test (`level-set.ts`) tells
 * afterwards whether one was missed.
 */
export function findPeaks(form: SpectralForm, band: Band, options: PeakOptions = peakDefaults): Peak[] {
  if (form.inputs === 0 || form.outputs === 0) return [];
  const gain = gainFunction(form);
  const grid = startGrid(form, band, options);
  const sigma = grid.map(gain);
  const highest = sigma.reduce((high, s) => Math.max(high, s), 0);
  const peaks: Peak[] = [];
  for (let k = 0; k < grid.length; k++) {
    const left = k === 0 ? Number.NEGATIVE_INFINITY : sigma[k - 1];
    const right = k === grid.length - 1 ? Number.NEGATIVE_INFINITY : sigma[k + 1];
    if (sigma[k] < 0.8 * options.keep * highest || sigma[k] < left || sigma[k] < right) continue;
    const low = grid[Math.max(0, k - 1)];
    const high = grid[Math.min(grid.length - 1, k + 1)];
    peaks.push(polishPeak(gain, low, grid[k], high, sigma[k], options.accuracy));
  }
  peaks.sort((a, b) => b.sigma - a.sigma);
  const top = peaks[0]?.sigma ?? 0;
  return distinct(peaks.filter((peak) => peak.sigma >= options.keep * top));
}

/**
 * Local maximum in [low, high] that is no lower than at `start`, by parabolic steps safeguarded
 * with golden sections.
 *
 * Source: Brent, Algorithms for Minimization without Derivatives, 1973, ch. 5.
 */
// biome-ignore lint/complexity/noExcessiveCognitiveComplexity: Brent's method is one small state machine
export function polishPeak(
  gain: (omega: number) => number,
  low: number,
  start: number,
  high: number,
  sigmaAtStart: number,
  accuracy: number = peakDefaults.accuracy,
): Peak {
  const golden = 0.381966011250105;
  let a = low;
  let b = high;
  let x = start;
  let w = start;
  let v = start;
  let fx = sigmaAtStart;
  let fw = fx;
  let fv = fx;
  let step = 0;
  let before = 0;
  for (let iteration = 0; iteration < 60; iteration++) {
    const middle = 0.5 * (a + b);
    const tolerance = accuracy * Math.abs(x) + 1e-300;
    if (Math.abs(x - middle) <= 2 * tolerance - 0.5 * (b - a)) break;
    const parabolic = parabolicStep(x, fx, w, fw, v, fv);
    const useful =
      Math.abs(parabolic) < Math.abs(0.5 * before) &&
      x + parabolic > a &&
      x + parabolic < b &&
      parabolic !== 0;
    before = useful ? step : x >= middle ? a - x : b - x;
    step = useful ? parabolic : golden * before;
    const u = x + (Math.abs(step) >= tolerance ? step : step >= 0 ? tolerance : -tolerance);
    const fu = gain(u);
    if (fu >= fx) {
      if (u >= x) a = x;
      else b = x;
      [v, fv, w, fw, x, fx] = [w, fw, x, fx, u, fu];
    } else {
      if (u < x) a = u;
      else b = u;
      if (fu >= fw || w === x) [v, fv, w, fw] = [w, fw, u, fu];
      else if (fu >= fv || v === x || v === w) [v, fv] = [u, fu];
    }
  }
  return { omega: x, sigma: fx };
}

/** Step from x to the vertex of the parabola through the three points; 0 when there is none. */
function parabolicStep(x: number, fx: number, w: number, fw: number, v: number, fv: number): number {
  const r = (x - w) * (fx - fv);
  const q = (x - v) * (fx - fw);
  const denominator = 2 * (q - r);
  return denominator === 0 ? 0 : -((x - v) * q - (x - w) * r) / denominator;
}

function startGrid(form: SpectralForm, band: Band, { screen, extra }: PeakOptions): number[] {
  const { eigen, poles } = form;
  const own = Array.from(poles, (_, slot) => ownPeak(form, slot));
  const strongest = own.reduce((high, value) => Math.max(high, Number.isFinite(value) ? value : 0), 0);
  const marks: number[] = [band.low, ...extra];
  let furthest = eigen.shift;
  poles.forEach((j, slot) => {
    if (!Number.isFinite(eigen.re[j])) return;
    furthest = Math.max(furthest, Math.hypot(eigen.re[j], eigen.im[j]));
    if (own[slot] < screen * strongest) return;
    marks.push(eigen.im[j]);
    // A well damped pole peaks lower than its Im λ by more than its neighbourhood is wide.
    if (Math.abs(eigen.re[j]) > 0.05 * eigen.im[j]) {
      marks.push(Math.sqrt(Math.max(0, eigen.im[j] ** 2 - eigen.re[j] ** 2)));
    }
  });
  marks.push(Number.isFinite(band.high) ? band.high : 10 * furthest);
  const inside = marks.filter((omega) => omega >= band.low && omega <= Math.min(band.high, 10 * furthest));
  inside.sort((a, b) => a - b);
  const grid: number[] = [];
  inside.forEach((omega, k) => {
    if (k > 0 && omega > inside[k - 1]) grid.push(0.5 * (omega + inside[k - 1]));
    if (k === 0 || omega > inside[k - 1]) grid.push(omega);
  });
  return grid;
}

function distinct(peaks: readonly Peak[]): Peak[] {
  const kept: Peak[] = [];
  for (const peak of peaks) {
    if (
      kept.every((other) => Math.abs(other.omega - peak.omega) > 1e-7 * Math.max(other.omega, peak.omega))
    ) {
      kept.push(peak);
    }
  }
  return kept;
}
