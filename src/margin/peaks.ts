import { type ComplexMatrix, complexZeros } from "../numerics/dense/matrix.js";
import { largestSingularValue } from "../numerics/dense/svd.js";
import type { Band } from "./band.js";
import { type Peak, polishPeak } from "./polish-peak.js";
import { ownPeak, type SpectralForm, transferInto } from "./transfer.js";

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
  const gain = remembering(gainFunction(form));
  const grid = startGrid(form, gain, band, options);
  const sigma = grid.map(({ omega }) => gain(omega));
  const highest = sigma.reduce((high, s) => Math.max(high, s), 0);
  const peaks: Peak[] = [];
  for (let k = 0; k < grid.length; k++) {
    const left = k === 0 ? Number.NEGATIVE_INFINITY : sigma[k - 1];
    const right = k === grid.length - 1 ? Number.NEGATIVE_INFINITY : sigma[k + 1];
    if (sigma[k] < 0.8 * options.keep * highest || sigma[k] < left || sigma[k] < right) continue;
    const { omega, width } = grid[k];
    const low = grid[Math.max(0, k - 1)].omega;
    const high = grid[Math.min(grid.length - 1, k + 1)].omega;
    const room = 0.25 * (high - low);
    const step = width > 0 ? Math.min(0.5 * width, room) : room;
    peaks.push(polishPeak(gain, low, omega, high, sigma[k], { accuracy: options.accuracy, step }));
  }
  const last = grid.length - 1;
  if (
    !Number.isFinite(band.high) &&
    sigma[last] > 0 &&
    growsWithoutBound(gain, grid[last].omega, sigma[last])
  ) {
    return [{ omega: grid[last].omega, sigma: Number.POSITIVE_INFINITY }];
  }
  peaks.sort((a, b) => b.sigma - a.sigma);
  const top = peaks[0]?.sigma ?? 0;
  return distinct(peaks.filter((peak) => peak.sigma >= options.keep * top));
}

/** The same function, which answers a frequency asked for again from memory: start points coincide with poles looked at. */
function remembering(gain: (omega: number) => number): (omega: number) => number {
  const known = new Map<number, number>();
  return (omega) => {
    let value = known.get(omega);
    if (value === undefined) {
      value = gain(omega);
      known.set(omega, value);
    }
    return value;
  };
}

/** Whether a gain still grows like ω between ω/1000 and ω, where every finite pole lies far below. */
export function growsWithoutBound(gain: (omega: number) => number, omega: number, sigma: number): boolean {
  return sigma > 500 * gain(1e-3 * omega);
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
): Mark[] {
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
function subdivided(marks: readonly Mark[]): Mark[] {
  const sorted = [...marks].sort((a, b) => a.omega - b.omega);
  const grid: Mark[] = [];
  sorted.forEach((mark, k) => {
    const { omega, width } = mark;
    const previous = sorted[k - 1];
    if (previous !== undefined) {
      const gap = omega - previous.omega;
      if (gap <= 0) return;
      const parts = gap < apart * Math.max(width, previous.width) ? 4 : 2;
      for (let part = 1; part < parts; part++)
        grid.push({ omega: previous.omega + (gap * part) / parts, width: 0 });
    }
    grid.push(mark);
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
