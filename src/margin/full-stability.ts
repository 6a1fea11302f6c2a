import type { ModelState } from "../model/parametric-model.js";
import type { AdaptiveModel } from "../reduction/adaptive-model.js";
import { covers, mostOnStretch } from "./axis-walk.js";
import { inBand } from "./band.js";
import type { FullCrew } from "./full-tasks.js";
import type { Setting } from "./measure.js";
import type { NearbyEigenvalue, Neighbourhood } from "./nearby-eigenvalues.js";
import { dampingRatio, isUnstable } from "./stability.js";

/** An eigenvalue with Im ≥ 0 [1/s, rad/s]. */
export interface Eigenvalue {
  readonly re: number;
  readonly im: number;
}

/** The stability of the unperturbed model at one point, decided by eigenvalues of the full model. */
export interface StabilityVerdict {
  /** Right of the axis inside the band, conjugate pairs counted as two. */
  readonly unstable: number;
  /** The same outside the band, up to 1.3 times its upper end and at zero. */
  readonly unstableOutside: number;
  /** Eigenvalues on the axis within rounding, inside the band. */
  readonly onAxis: number;
  /** Largest real part in the band [1/s]; −Infinity when the band holds no eigenvalue. */
  readonly abscissa: number;
  /** Least damped eigenvalues in the band, least damped first. */
  readonly leastDamped: readonly Eigenvalue[];
  /** Full-model eigenvalues that are unstable though the reduced model had not seen them so. */
  readonly missed: readonly NearbyEigenvalue[];
  /** Suspects (unstable or ζ < 1e-3) confirmed or refuted by the full model, and those (or a part of the axis) left open. */
  readonly examined: number;
  readonly open: number;
}

const suspicious = 1e-3;
/** Unstable modes just outside the band are common: they are looked for up to here. */
export const outsideReach = 1.3;
/** Stretches of the axis walked independently; their number is fixed, so that the discs do not depend on the threads. */
const STRETCHES = 4;
/** Discs round suspects off the axis at most. */
const mostSuspects = 20;

/**
 * Covers the imaginary axis by shift-and-invert Arnoldi on the full model, so that what the reduced model missed is
 * found, and confirms or refutes every reduced eigenvalue that is unstable or nearly so (ζ < 1e-3) in the same way.
 */
export async function judgeStability(
  crew: FullCrew,
  adaptive: AdaptiveModel,
  state: ModelState,
  setting: Setting,
  reduced: { readonly re: Float64Array; readonly im: Float64Array },
): Promise<StabilityVerdict> {
  const reach = outsideReach * setting.band.high;
  const all = eigenvalueList(reduced).filter(({ im }) => im <= reach);
  if (adaptive.exact) return verdictOf(all, [], setting, all.filter(isSuspect(setting)).length, 0);
  const suspects = all.filter(isSuspect(setting)).sort((a, b) => a.im - b.im);
  const { neighbourhoods, open, walked } = await coverSuspects(crew, state, setting, suspects, reach);
  // Discs reach further than the rule says; what lies there is counted by nobody.
  const found = distinctEigenvalues(neighbourhoods).filter(({ im }) => im <= reach);
  const rest = all.filter((value) => !neighbourhoods.some((area) => covers(area, value)));
  const missed = found.filter(
    (value) => isUnstable(value.re, value.im, setting.shift) && !all.some((known) => close(known, value)),
  );
  return verdictOf([...found, ...rest], missed, setting, suspects.length, open.length + (walked ? 0 : 1));
}

function isSuspect(setting: Setting): (value: Eigenvalue) => boolean {
  return ({ re, im }) => isUnstable(re, im, setting.shift) || dampingRatio(re, im) < suspicious;
}

/** Discs along the axis, then round every suspect that none of them holds. */
async function coverSuspects(
  crew: FullCrew,
  state: ModelState,
  setting: Setting,
  suspects: readonly Eigenvalue[],
  reach: number,
): Promise<{ neighbourhoods: Neighbourhood[]; open: readonly Eigenvalue[]; walked: boolean }> {
  const scale = setting.shift;
  const stretches = Array.from({ length: STRETCHES }, (_, k) => ({
    state,
    from: (k / STRETCHES) * reach,
    to: ((k + 1) / STRETCHES) * reach,
    stride: 0.04 * reach,
    scale,
    seed: 1 + k * mostOnStretch,
  }));
  const walks = await crew.run("walk", stretches);
  const neighbourhoods = walks.flatMap(({ discs }) => discs);
  const isOpen = (suspect: Eigenvalue) => !neighbourhoods.some((area) => covers(area, suspect));
  const examined = new Set<Eigenvalue>();
  let seed = STRETCHES * mostOnStretch;
  while (examined.size < mostSuspects) {
    // A few at a time: one disc may hold several of them.
    const next = suspects.filter((suspect) => isOpen(suspect) && !examined.has(suspect)).slice(0, STRETCHES);
    if (next.length === 0) break;
    for (const suspect of next) examined.add(suspect);
    const asked = next.map(({ re, im }) => {
      seed++;
      return { state, re, im: im * (1 + 1e-5) + 1e-6 * scale, scale, seed };
    });
    neighbourhoods.push(...(await crew.run("neighbourhood", asked)));
  }
  const walked = walks.every(({ complete }) => complete);
  return { neighbourhoods, open: suspects.filter(isOpen), walked };
}

/** Two arrays as a list. */
export function eigenvalueList({
  re,
  im,
}: {
  readonly re: Float64Array;
  readonly im: Float64Array;
}): Eigenvalue[] {
  return Array.from(re, (value, j) => ({ re: value, im: im[j] }));
}

/** Counts and extremes of a list of eigenvalues with Im ≥ 0. */
export function verdictOf(
  eigenvalues: readonly Eigenvalue[],
  missed: readonly NearbyEigenvalue[],
  setting: Setting,
  examined: number,
  open: number,
): StabilityVerdict {
  const { band, shift } = setting;
  const inside = eigenvalues.filter(({ im }) => inBand(band, im));
  const outside = eigenvalues.filter(({ im }) => !inBand(band, im));
  const count = (list: readonly Eigenvalue[]) =>
    list.reduce((sum, { re, im }) => sum + (isUnstable(re, im, shift) ? (im > 0 ? 2 : 1) : 0), 0);
  const byDamping = [...inside].sort((a, b) => dampingRatio(a.re, a.im) - dampingRatio(b.re, b.im));
  return {
    unstable: count(inside),
    unstableOutside: count(outside),
    onAxis: inside.filter(({ re, im }) => Math.abs(re) <= 1e-10 * Math.max(im, 1e-3 * shift)).length,
    abscissa: inside.reduce((high, { re }) => Math.max(high, re), Number.NEGATIVE_INFINITY),
    leastDamped: byDamping.slice(0, 10).map(({ re, im }) => ({ re, im })),
    missed,
    examined,
    open,
  };
}

function close(a: Eigenvalue, b: Eigenvalue): boolean {
  return Math.hypot(a.re - b.re, a.im - b.im) <= 1e-3 * Math.hypot(a.re, a.im);
}

/** Eigenvalues of all discs with Im ≥ 0, each once. */
function distinctEigenvalues(neighbourhoods: readonly Neighbourhood[]): NearbyEigenvalue[] {
  const kept: NearbyEigenvalue[] = [];
  for (const area of neighbourhoods) {
    const fresh = area.eigenvalues.filter((value) => {
      const tolerance = 1e-7 * Math.hypot(value.re, value.im);
      const same = (other: NearbyEigenvalue) =>
        Math.hypot(other.re - value.re, other.im - value.im) <= tolerance;
      return value.im >= 0 && covers(area, value) && !kept.some(same);
    });
    kept.push(...fresh);
  }
  return kept;
}
