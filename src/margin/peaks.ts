import { type ComplexMatrix, complexZeros } from "../numerics/dense/matrix.js";
import { largestSingularValue } from "../numerics/dense/svd.js";
import type { Band } from "./band.js";
import { ownPeak, type SpectralForm, transferInto } from "./transfer.js";

/** A local maximum of σ_max(H(iω)) over the band. */
export interface Peak {
  /** [rad/s] */
  readonly omega: number;
  /** Infinity when the gain grows without bound towards infinite frequency; `omega` is just far up then. */
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

/** Heights closer than this, relative, differ by rounding only. */
const sameHeight = 1e-15;

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
  const grid = startGrid(form, gain, band, options);
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
  const last = grid.length - 1;
  if (!Number.isFinite(band.high) && sigma[last] > 0 && growsWithoutBound(gain, grid[last], sigma[last])) {
    return [{ omega: grid[last], sigma: Number.POSITIVE_INFINITY }];
  }
  peaks.sort((a, b) => b.sigma - a.sigma);
  const top = peaks[0]?.sigma ?? 0;
  return distinct(peaks.filter((peak) => peak.sigma >= options.keep * top));
}

/** Whether a gain still grows like ω between ω/1000 and ω, where every finite pole lies far below. */
export function growsWithoutBound(gain: (omega: number) => number, omega: number, sigma: number): boolean {
  return sigma > 500 * gain(1e-3 * omega);
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
  // Between equal heights the iteration wanders off by a rounding error; ω = 0 is to stay ω = 0.
  return fx > sigmaAtStart * (1 + sameHeight)
    ? { omega: x, sigma: fx }
    : { omega: start, sigma: sigmaAtStart };
}

/** Step from x to the vertex of the parabola through the three points; 0 when there is none. */
function parabolicStep(x: number, fx: number, w: number, fw: number, v: number, fv: number): number {
  const r = (x - w) * (fx - fv);
  const q = (x - v) * (fx - fw);
  const denominator = 2 * (q - r);
  return denominator === 0 ? 0 : -((x - v) * q - (x - w) * r) / denominator;
}

/** Without an upper end of the band the gain is looked at up to here, over the furthest pole: its limit at infinity. */
const farthest = [10, 1e3, 1e6];

/**
 * Slots of the poles that can make a peak: strongest first, until the own peak of one is below `screen` of the highest
 * gain met so far. The gain is the yardstick, not the strongest own peak: close or well damped modes
 * may have large residues that nearly cancel.
 */
function polesThatMatter(
  form: SpectralForm,
  gain: (omega: number) => number,
  band: Band,
  screen: number,
): Set<number> {
  const own = Array.from(form.kept, (_, slot) => ownPeak(form, slot));
  const order = Array.from(own.keys()).sort((a, b) => own[b] - own[a]);
  const kept = new Set<number>();
  let highest = 0;
  for (const slot of order) {
    if (own[slot] < screen * highest) break;
    kept.add(slot);
    const omega = form.poles.im[form.kept[slot]];
    const height = omega >= band.low && omega <= band.high ? gain(omega) : 0;
    if (Number.isFinite(height)) highest = Math.max(highest, height);
  }
  return kept;
}

function startGrid(
  form: SpectralForm,
  gain: (omega: number) => number,
  band: Band,
  { screen, extra }: PeakOptions,
): number[] {
  const { poles, kept } = form;
  const matters = polesThatMatter(form, gain, band, screen);
  const marks: Mark[] = [band.low, ...extra].map((omega) => ({ omega, width: 0 }));
  let furthest = poles.shift;
  kept.forEach((j, slot) => {
    const [size, im, width] = [Math.hypot(poles.re[j], poles.im[j]), poles.im[j], Math.abs(poles.re[j])];
    furthest = Math.max(furthest, size);
    if (!matters.has(slot)) return;
    marks.push({ omega: im, width });
    // A well damped pole peaks away from its Im λ by more than its neighbourhood is wide: stiffness errors
    // see it lower, damping errors at |λ|.
    if (width > 0.05 * im) {
      const lower = Math.sqrt(Math.max(0, im ** 2 - width ** 2));
      marks.push({ omega: lower, width }, { omega: size, width });
    }
  });
  const ends = Number.isFinite(band.high) ? [band.high] : farthest.map((factor) => factor * furthest);
  marks.push(...ends.map((omega) => ({ omega, width: 0 })));
  return subdivided(marks.filter(({ omega }) => omega >= band.low && omega <= ends[ends.length - 1]));
}

/** A start frequency and the half width of the resonance it belongs to, 0 for none [rad/s]. */
interface Mark {
  readonly omega: number;
  readonly width: number;
}

/** Resonances this many half widths apart do not blend. */
const apart = 8;

/**
 * The marks in order with points between them: the middle, and the quarters where resonances blend, for there the
 * gain peaks between the poles too.
 */
function subdivided(marks: readonly Mark[]): number[] {
  const sorted = [...marks].sort((a, b) => a.omega - b.omega);
  const grid: number[] = [];
  sorted.forEach(({ omega, width }, k) => {
    const previous = sorted[k - 1];
    if (previous !== undefined) {
      const gap = omega - previous.omega;
      if (gap <= 0) return;
      const parts = gap < apart * Math.max(width, previous.width) ? 4 : 2;
      for (let part = 1; part < parts; part++) grid.push(previous.omega + (gap * part) / parts);
    }
    grid.push(omega);
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
