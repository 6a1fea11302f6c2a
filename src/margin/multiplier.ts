import type { Pencil } from "../model/pencil.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { refineCrossing } from "./crossing.js";
import { type PathPoint, type PathSection, sectionAt, staysStable } from "./eigenvalue-path.js";
import {
  type Checked,
  type Critical,
  type Estimate,
  type Measure,
  realDirections,
  type Setting,
} from "./measure.js";
import { checkEigenvalue } from "./stability.js";

/** Paths are followed up to this multiple of the declared feeding terms; beyond it the answer is "none found". */
export const highestMultiplier = 1000;

/** Smallest step of the path, relative to the multiplier reached. */
const smallestStep = 1e-3;

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
  const found = firstCrossing(start, sections);
  if (found === null) return { value: Number.POSITIVE_INFINITY, criticals: [], eigenvalues };
  const { alpha, leading } = found;
  return { value: alpha, criticals: [asCritical("crossing", alpha, leading)], eigenvalues };
}

/** The first section on the path that is unstable, pinched down to rounding; null when there is none. */
function firstCrossing(start: PathSection, sectionOf: (alpha: number) => PathSection): PathSection | null {
  let from = start;
  let step = 0.125;
  while (from.alpha < highestMultiplier) {
    const floor = smallestStep * Math.max(from.alpha, 0.05);
    const to = sectionOf(from.alpha + step);
    const [stable, unstable] = to.unstable ? pinch(from, to, sectionOf) : [to, null];
    if (!staysStable(from, stable) && stable.alpha - from.alpha > floor) {
      step = 0.5 * (stable.alpha - from.alpha);
      continue;
    }
    if (unstable !== null) return unstable;
    from = to;
    step *= 2;
  }
  return null;
}

/** The crossing between a stable and an unstable section, pinched to rounding: [last stable, first unstable]. */
function pinch(
  stable: PathSection,
  unstable: PathSection,
  sectionOf: (alpha: number) => PathSection,
): [PathSection, PathSection] {
  let [low, high] = [stable, unstable];
  let latest = unstable;
  for (let iteration = 0; iteration < 60 && high.alpha - low.alpha > 1e-11 * high.alpha; iteration++) {
    const guess = newtonGuess(latest);
    // Overshoot by a hair, so that steps land on both sides and the bracket closes.
    const nudged = guess + (iteration % 2 === 0 ? 1e-9 : -1e-9) * high.alpha;
    const inside = nudged > low.alpha && nudged < high.alpha && iteration % 4 !== 3;
    latest = sectionOf(inside ? nudged : 0.5 * (low.alpha + high.alpha));
    if (latest.unstable) high = latest;
    else low = latest;
    if (high.leading !== undefined && high.leading.re <= 1e-12 * Math.hypot(high.leading.re, high.leading.im))
      break;
  }
  return [low, high];
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
  if (critical.kind === "eigenvalue") return checkEigenvalue(pencilAt(0), critical, lift, () => 0);
  const omega = critical.omega < 1e-6 * setting.shift ? 0 : critical.omega;
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
