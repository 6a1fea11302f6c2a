import { type Pencil, withFactor } from "../model/pencil.js";
import { type ComplexVector, complexColumn } from "../numerics/dense/matrix.js";
import type { QuadraticPoles } from "../numerics/dense/quadratic-companion.js";
import type { QuadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import { inBand } from "./band.js";
import { refineEigenpair } from "./eigenpair.js";
import { type Checked, type Critical, realDirections, type Setting } from "./measure.js";

/**
 * Whether an eigenvalue lies right of the axis by more than rounding. Near s = 0 the double
 * eigenvalue of a free body scatters by √eps, hence the coarser bound there.
 */
export function isUnstable(re: number, im: number, shift: number): boolean {
  return re > stabilityThreshold(re, im, shift);
}

/** The real part [1/s] up to which an eigenvalue counts as lying on the axis. */
export function stabilityThreshold(re: number, im: number, shift: number): number {
  const size = Math.hypot(re, im);
  return size < 1e-5 * shift ? 1e-6 * shift : 1e-10 * size;
}

/** Damping ratio ζ = −Re s/|s|. */
export function dampingRatio(re: number, im: number): number {
  const size = Math.hypot(re, im);
  return size === 0 ? 0 : -re / size;
}

/** Eigenvalues with Im ≥ 0 right of the axis and inside the band, most unstable first. */
export function unstableCriticals(
  poles: QuadraticPoles,
  vectors: () => QuadraticEigen,
  setting: Setting,
): Critical[] {
  return selectEigenvalues(
    poles,
    vectors,
    (re, im) => inBand(setting.band, im) && isUnstable(re, im, setting.shift),
    (re) => -re / setting.omegaRef,
  );
}

/** Eigenvalues with Im ≥ 0 that pass, as criticals with the value given, smallest value first. */
export function selectEigenvalues(
  poles: QuadraticPoles,
  vectors: () => QuadraticEigen,
  pass: (re: number, im: number) => boolean,
  value: (re: number, im: number) => number,
): Critical[] {
  const found: Critical[] = [];
  for (let j = 0; j < poles.re.length; j++) {
    const re = poles.re[j];
    const im = poles.im[j];
    if (im < 0 || !Number.isFinite(re) || !pass(re, im)) continue;
    found.push(eigenvalueCritical(poles, vectors, j, value(re, im)));
  }
  return found.sort((a, b) => a.value - b.value);
}

/**
 * Eigenvalue number j as a critical whose vectors are asked for when first needed: a search needs none.
 *
 * @param vectors - decomposition of the same pencil with the same shift, hence with the same order of eigenvalues.
 */
export function eigenvalueCritical(
  poles: QuadraticPoles,
  vectors: () => QuadraticEigen,
  j: number,
  value: number,
): Critical {
  return {
    kind: "eigenvalue",
    value,
    re: poles.re[j],
    omega: poles.im[j],
    get right() {
      return complexColumn(vectors().right, j);
    },
    get left() {
      return leftVector(vectors(), j);
    },
  };
}

/** y_j with yᴴ the j-th row of Z. */
export function leftVector(eigen: QuadraticEigen, j: number): ComplexVector {
  const { re, im, rows, cols } = eigen.left;
  return {
    re: Float64Array.from({ length: cols }, (_, k) => re[j + k * rows]),
    im: Float64Array.from({ length: cols }, (_, k) => -im[j + k * rows]),
  };
}

/** Eigenvalues with Im ≥ 0 of a decomposition. */
export function upperHalf({ re, im }: QuadraticPoles): { re: Float64Array; im: Float64Array } {
  const keep = Array.from(im.keys()).filter((j) => im[j] >= 0 && Number.isFinite(re[j]));
  return { re: Float64Array.from(keep, (j) => re[j]), im: Float64Array.from(keep, (j) => im[j]) };
}

/** Inverse iteration on the full model from a reduced eigenpair; `value` turns λ into the measure. */
export function checkEigenvalue(
  pencil: Pencil,
  critical: Critical,
  lift: (reduced: ComplexVector) => ComplexVector,
  shift: number,
  value: (re: number, im: number) => number,
): Checked {
  if (critical.kind === "peak") throw new Error("a peak is no eigenvalue");
  const { re, omega } = critical;
  // A rigid motion makes P(0) singular exactly; a little to the right the iteration works as well.
  const aside = Math.hypot(re, omega) < 1e-6 * shift ? 1e-4 * shift : 0;
  const pair = withFactor(pencil, re + aside, omega, (factor) =>
    refineEigenpair(pencil, re, omega, lift(critical.right), lift(critical.left), factor),
  );
  return {
    value: value(pair.re, pair.im),
    omega: Math.abs(pair.im),
    error: pair.residual,
    converged: pair.converged,
    directions: realDirections(pair.right, pair.left),
    found: { kind: "eigenvalue", pair },
  };
}
