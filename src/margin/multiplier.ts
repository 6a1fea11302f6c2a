import type { Pencil } from "../model/pencil.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { type Crossing, refineCrossing } from "./crossing.js";
import { blend, type PathPoint, type PathSection, sectionAt, staysStable } from "./eigenvalue-path.js";
import {
  type Checked,
  type Critical,
  type Estimate,
  type Measure,
  realDirections,
  type Setting,
} from "./measure.js";
import { checkEigenvalue, isUnstable, stabilityThreshold } from "./stability.js";

/**
 * Paths are followed up to this multiple of the declared feeding terms, or of what makes them weigh as much as the
 * rest of the model, whichever is more; beyond it the answer is "none found".
 */
export const highestMultiplier = 1000;

/** First step of the path, and the smallest relative to the multiplier reached. */
const firstStep = 0.125;
const smallestStep = 1e-3;

/** Relative width to which a crossing is bracketed before it is polished. */
const coarse = 1e-3;

function estimate(pencilAt: (multiplier: number) => DensePencil, setting: Setting): Estimate {
  const without = pencilAt(0);
  const unit = pencilAt(1);
  const sections = (alpha: number) => sectionAt(without, unit, alpha, setting);
  const now = sections(1);
  const eigenvalues = {
    re: Float64Array.from(now.points, (point) => point.re),
    im: Float64Array.from(now.points, (point) => point.im),
  };
  const start = sections(0);
  if (start.unstable)
    return { value: 0, criticals: [asCritical("eigenvalue", 0, start.leading)], eigenvalues };
  const found = firstCrossing(start, sections, balancingMultiplier(without, unit, setting.shift));
  if (found === null) return { value: Number.POSITIVE_INFINITY, criticals: [], eigenvalues };
  const critical = polished(found, (alpha) => blend(without, unit, alpha), sections, setting);
  return { value: critical.value, criticals: [critical], eigenvalues };
}

/** Last stable and first unstable section around the first crossing, not yet polished. */
type Bracket = readonly [PathSection, PathSection];

/**
 * The first crossing on the path, bracketed coarsely; null when there is none.
 *
 * @param balancing - multiplier at which the feeding terms weigh as much as the rest of the model.
 */
function firstCrossing(
  start: PathSection,
  sectionOf: (alpha: number) => PathSection,
  balancing: number,
): Bracket | null {
  if (!Number.isFinite(balancing)) return null;
  const unit = Math.min(1, balancing);
  let from = start;
  let step = firstStep * unit;
  while (from.alpha < highestMultiplier * Math.max(1, balancing)) {
    const floor = smallestStep * Math.max(from.alpha, 0.05 * unit);
    const to = sectionOf(from.alpha + step);
    const bracket = to.unstable ? pinch([from, to], sectionOf, coarse) : null;
    const stable = bracket === null ? to : bracket[0];
    if (!staysStable(from, stable) && stable.alpha - from.alpha > floor) {
      step = 0.5 * (stable.alpha - from.alpha);
      continue;
    }
    if (bracket !== null) return bracket;
    from = to;
    step *= 2;
  }
  return null;
}

/** ‖P₀‖/‖P₁ − P₀‖ at |s| = s₀ (Frobenius norms, term by term); Infinity when the multiplier scales nothing. */
function balancingMultiplier(without: DensePencil, unit: DensePencil, shift: number): number {
  let [rest, fed] = [0, 0];
  for (const [name, weight] of [
    ["massMatrix", shift * shift],
    ["velocityMatrix", shift],
    ["displacementMatrix", 1],
  ] as const) {
    const before = without[name].values;
    rest += weight * Math.hypot(...before);
    fed += weight * Math.hypot(...unit[name].values.map((value, q) => value - before[q]));
  }
  return rest / fed;
}

/** Narrows a bracket to the given relative width: Newton steps along the leading path, halving in between. */
function pinch(
  [stable, unstable]: Bracket,
  sectionOf: (alpha: number) => PathSection,
  width: number,
): Bracket {
  let [low, high] = [stable, unstable];
  let latest = unstable;
  for (let iteration = 0; iteration < 60 && high.alpha - low.alpha > width * high.alpha; iteration++) {
    // Overshoot a little to alternating sides, so that the bracket closes from both.
    const guess = newtonGuess(latest) + (iteration % 2 === 0 ? 0.4 : -0.4) * width * high.alpha;
    const inside = guess > low.alpha && guess < high.alpha && iteration % 3 !== 2;
    latest = sectionOf(inside ? guess : 0.5 * (low.alpha + high.alpha));
    if (latest.unstable) high = latest;
    else low = latest;
  }
  return [low, high];
}

/**
 * The crossing inside a bracket to full accuracy by inverse iteration, which weak damping lets converge from close by
 * only. Undamped modes that coalesce leave a defective eigenvalue there, on which it fails: then the bracket is
 * narrowed to rounding instead.
 */
function polished(
  bracket: Bracket,
  pencilAt: (alpha: number) => DensePencil,
  sectionOf: (alpha: number) => PathSection,
  setting: Setting,
): Critical {
  let narrow = bracket;
  for (const width of [coarse, 1e-5, 1e-7]) {
    narrow = pinch(narrow, sectionOf, width);
    const found = crossingInside(narrow, pencilAt, setting);
    if (found === undefined) continue;
    const { alpha, omega, right, left } = found;
    return { kind: "crossing", value: alpha, re: 0, omega, right, left };
  }
  const [, last] = pinch(narrow, sectionOf, 1e-11);
  return asCritical("crossing", last.alpha, last.leading);
}

/** The polished crossing, if inverse iteration finds one that belongs to the bracket. */
function crossingInside(
  [low, high]: Bracket,
  pencilAt: (alpha: number) => DensePencil,
  setting: Setting,
): Crossing | undefined {
  const { leading } = high;
  if (leading === undefined) throw new Error("an unstable section has a leading point");
  const omega = resting(leading.im, setting);
  const found = refineCrossing(pencilAt, high.alpha, omega, leading.right, leading.left);
  // A section counts as unstable a little late only: from a real part on that is more than rounding.
  const late =
    found.drift === 0 ? 0 : stabilityThreshold(0, found.omega, setting.shift) / Math.abs(found.drift);
  const slack = 2 * (high.alpha - low.alpha) + late;
  const inside = found.alpha > low.alpha - slack && found.alpha < high.alpha + slack;
  return found.converged && inside ? found : undefined;
}

/** A frequency that is zero but for rounding is zero: divergence. */
function resting(omega: number, setting: Setting): number {
  return omega < 1e-6 * setting.shift ? 0 : omega;
}

function newtonGuess(section: PathSection): number {
  const { leading, alpha } = section;
  return leading === undefined || leading.slopeRe === 0 ? Number.NaN : alpha - leading.re / leading.slopeRe;
}

function asCritical(kind: "eigenvalue" | "crossing", value: number, point: PathPoint | undefined): Critical {
  if (point === undefined) throw new Error("an unstable section has a leading point");
  return { kind, value, re: point.re, omega: point.im, right: point.right, left: point.left };
}

function check(
  pencilAt: (multiplier: number) => Pencil,
  critical: Critical,
  lift: (reduced: ComplexVector) => ComplexVector,
  setting: Setting,
): Checked {
  if (critical.kind === "peak") throw new Error("a multiplier has no peaks");
  if (critical.kind === "eigenvalue")
    return checkEigenvalue(pencilAt(0), critical, lift, setting.shift, (re, im) =>
      isUnstable(re, im, setting.shift) ? 0 : Number.POSITIVE_INFINITY,
    );
  const omega = resting(critical.omega, setting);
  const crossing = refineCrossing(pencilAt, critical.value, omega, lift(critical.right), lift(critical.left));
  return {
    value: crossing.alpha,
    omega: crossing.omega,
    error: crossing.residual,
    converged: crossing.converged,
    directions: realDirections(crossing.right, crossing.left),
    found: { kind: "crossing", crossing },
  };
}

/**
 * Critical multiplier: the infimum of α > 0 at which an eigenvalue of P₀(s) + α (N + sF) enters
 * Re s > 0. Infinity when none does up to `highestMultiplier`, 0 when P₀ itself is unstable.
 * The reduced model is followed along α with error control, the crossing polished on the full one.
 */
export const multiplier: Measure = { name: "multiplier", estimate, check };
