import { applyPencil } from "../model/pencil.js";
import { addScaledInto } from "../numerics/dense/complex-vectors.js";
import { type ComplexVector, complexColumn, type DenseMatrix } from "../numerics/dense/matrix.js";
import { quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { densePencil } from "../reduction/reduced-model.js";
import { inBand } from "./band.js";
import type { Setting } from "./measure.js";
import { isUnstable, leftVector } from "./stability.js";

/** One eigenvalue (Im ≥ 0) of P(s; α) with dλ/dα. */
export interface PathPoint {
  readonly re: number;
  readonly im: number;
  readonly slopeRe: number;
  readonly slopeIm: number;
  readonly right: ComplexVector;
  readonly left: ComplexVector;
}

/** The eigenvalues in the band at one multiplier. */
export interface PathSection {
  readonly alpha: number;
  readonly points: readonly PathPoint[];
  /** The point furthest right, undefined when the band holds none. */
  readonly leading: PathPoint | undefined;
  readonly unstable: boolean;
}

/** Eigenvalues of the blend (1 − α) P₀ + α P₁ whose frequency lies in the band. */
export function sectionAt(
  without: DensePencil,
  unit: DensePencil,
  alpha: number,
  setting: Setting,
): PathSection {
  const pencil = blend(without, unit, alpha);
  const eigen = quadraticEigen(
    pencil.massMatrix,
    pencil.velocityMatrix,
    pencil.displacementMatrix,
    setting.shift,
  );
  const points: PathPoint[] = [];
  for (let j = 0; j < eigen.re.length; j++) {
    const [re, im] = [eigen.re[j], eigen.im[j]];
    if (im < 0 || !Number.isFinite(re) || !inBand(setting.band, im)) continue;
    const right = complexColumn(eigen.right, j);
    const left = leftVector(eigen, j);
    const fed = applyPencil(unit, re, im, right);
    addScaledInto(fed, -1, 0, applyPencil(without, re, im, right));
    // With the scaling of `QuadraticEigen`, yᴴP′(λ)x = −θ.
    const [slopeRe, slopeIm] = quotient(fed, left, eigen.thetaRe[j], eigen.thetaIm[j]);
    points.push({ re, im, slopeRe, slopeIm, right, left });
  }
  const leading = points.reduce<PathPoint | undefined>(
    (best, point) => (best === undefined || point.re > best.re ? point : best),
    undefined,
  );
  const unstable = points.some((point) => isUnstable(point.re, point.im, setting.shift));
  return { alpha, points, leading, unstable };
}

/** yᴴ f / θ. */
function quotient(f: ComplexVector, y: ComplexVector, thetaRe: number, thetaIm: number): [number, number] {
  let re = 0;
  let im = 0;
  for (let i = 0; i < f.re.length; i++) {
    re += y.re[i] * f.re[i] + y.im[i] * f.im[i];
    im += y.re[i] * f.im[i] - y.im[i] * f.re[i];
  }
  const size = thetaRe * thetaRe + thetaIm * thetaIm;
  return [(re * thetaRe + im * thetaIm) / size, (im * thetaRe - re * thetaIm) / size];
}

/** (1 − α) P₀ + α P₁. */
export function blend(without: DensePencil, unit: DensePencil, alpha: number): DensePencil {
  const mix = (a: DenseMatrix, b: DenseMatrix): DenseMatrix => ({
    rows: a.rows,
    cols: a.cols,
    values: a.values.map((value, q) => value + alpha * (b.values[q] - value)),
  });
  return densePencil(
    mix(without.massMatrix, unit.massMatrix),
    mix(without.velocityMatrix, unit.velocityMatrix),
    mix(without.displacementMatrix, unit.displacementMatrix),
    mix(without.stiffnessMatrix, unit.stiffnessMatrix),
    unit.inputMatrix,
    unit.powers,
    unit.outputTransposedMatrix,
  );
}

/**
 * Whether the paths between two sections are known well enough that none can have entered the
 * right half plane and come back: every point predicted from either end meets its partner, and the cubic
 * through both ends stays left of the axis.
 */
export function staysStable(from: PathSection, to: PathSection): boolean {
  const h = to.alpha - from.alpha;
  return from.points.every((a) => {
    const expectedRe = a.re + h * a.slopeRe;
    const expectedIm = a.im + h * a.slopeIm;
    const b = nearest(to.points, expectedRe, expectedIm);
    if (b === undefined) return true;
    const errorRe = b.re - a.re - 0.5 * h * (a.slopeRe + b.slopeRe);
    const errorIm = b.im - a.im - 0.5 * h * (a.slopeIm + b.slopeIm);
    const room = Math.max(Math.max(-a.re, -b.re), 1e-4 * Math.hypot(a.re, a.im));
    // The frequency only has to tell that both are the same mode; the real part decides.
    const size = Math.hypot(a.re, a.im);
    const sameMode = Math.abs(errorIm) <= Math.max(room, 2e-3 * size);
    return sameMode && Math.abs(errorRe) <= 0.5 * room && highestOfCubic(a, b, h) <= 1e-9 * size;
  });
}

function nearest(points: readonly PathPoint[], re: number, im: number): PathPoint | undefined {
  let best: PathPoint | undefined;
  let distance = Number.POSITIVE_INFINITY;
  for (const point of points) {
    const d = Math.hypot(point.re - re, point.im - im);
    if (d < distance) [best, distance] = [point, d];
  }
  return best;
}

/** Largest real part at the interior quarter points of the Hermite cubic. */
function highestOfCubic(a: PathPoint, b: PathPoint, h: number): number {
  let highest = Number.NEGATIVE_INFINITY;
  for (const t of [0.25, 0.5, 0.75]) {
    const value =
      (1 + 2 * t) * (1 - t) ** 2 * a.re +
      t * (1 - t) ** 2 * h * a.slopeRe +
      t * t * (3 - 2 * t) * b.re +
      t * t * (t - 1) * h * b.slopeRe;
    highest = Math.max(highest, value);
  }
  return highest;
}
