import { type Pencil, withFactor } from "../model/pencil.js";
import { type Neighbourhood, nearbyEigenvalues } from "./nearby-eigenvalues.js";

/** A stretch [from, to] of the imaginary axis [rad/s]. */
export interface Stretch {
  readonly from: number;
  readonly to: number;
  /** Radius expected of the first disc [rad/s]. */
  readonly stride: number;
  /** s₀ [rad/s]. */
  readonly scale: number;
  readonly seed: number;
}

export interface AxisWalk {
  readonly discs: readonly Neighbourhood[];
  /** False when the discs ran out before the end of the stretch. */
  readonly complete: boolean;
}

export const mostOnStretch = 50;
/** Where a disc does not reach back to the one before, more steps are cheaper than another factorisation. */
const alongAxis = { steps: 36, mostSteps: 72 };

/**
 * Covers a stretch of the axis with discs in which the full model's eigenvalues are known: most suspects lie in them,
 * and so does an unstable eigenvalue that the reduced model knows nothing of.
 */
export function walkAxis(pencil: Pencil, { from, to, stride: first, scale, seed }: Stretch): AxisWalk {
  const discs: Neighbourhood[] = [];
  // Where discs overlap by a tenth, they cover a strip beside the axis too.
  const topOf = ({ shiftIm, radius }: Neighbourhood) => shiftIm + 0.9 * radius;
  let stride = first;
  for (let at = from; at < to; ) {
    const over = discs.filter((area) => covers(area, { re: 0, im: at })).map(topOf);
    const next = over.reduce((high, top) => Math.max(high, top), at);
    if (next > at) {
      at = next;
      continue;
    }
    if (discs.length >= mostOnStretch) return { discs, complete: false };
    const ahead = Math.min(0.8 * stride, 0.5 * (to - at));
    const centre = Math.max(at + ahead, 1e-3 * scale);
    const effort = { ...alongAxis, reach: (centre - at) / 0.89 };
    const disc = withFactor(pencil, 0, centre, (factor) =>
      nearbyEigenvalues(pencil, factor, scale, seed + discs.length, effort),
    );
    discs.push(disc);
    // Too far ahead: a shorter stride closes the gap.
    stride = centre - 0.9 * disc.radius > at ? 0.5 * Math.min(stride, disc.radius) : disc.radius;
  }
  return { discs, complete: true };
}

/** Whether a disc holds a point. */
export function covers(
  area: Neighbourhood,
  { re, im }: { readonly re: number; readonly im: number },
): boolean {
  return Math.hypot(re - area.shiftRe, im - area.shiftIm) < area.radius;
}
