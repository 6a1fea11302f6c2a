import type { Pencil } from "../model/pencil.js";
import { type ComplexVector, complexColumn } from "../numerics/dense/matrix.js";
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
export function unstableCriticals(eigen: QuadraticEigen, setting: Setting): Critical[] {
  return selectEigenvalues(
    eigen,
    (re, im) => inBand(setting.band, im) && isUnstable(re, im, setting.shift),
    (re) => -re / setting.omegaRef,
  );
}

/** Eigenvalues with Im ≥ 0 that pass, as criticals with the value given, smallest value first. */
export function selectEigenvalues(
  eigen: QuadraticEigen,
  pass: (re: number, im: number) => boolean,
  value: (re: number, im: number) => number,
): Critical[] {
  const found: Critical[] = [];
  for (let j = 0; j < eigen.re.length; j++) {
    const re = eigen.re[j];
    const im = eigen.im[j];
    if (im < 0 || !Number.isFinite(re) || !pass(re, im)) continue;
    found.push(eigenvalueCritical(eigen, j, value(re, im)));
  }
  return found.sort((a, b) => a.value - b.value);
}

export function eigenvalueCritical(eigen: QuadraticEigen, j: number, value: number): Critical {
  const right = complexColumn(eigen.right, j);
  return {
    kind: "eigenvalue",
    value,
    re: eigen.re[j],
    omega: eigen.im[j],
    right,
    left: leftVector(eigen, j),
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
export function upperHalf(eigen: QuadraticEigen): { re: Float64Array; im: Float64Array } {
  const keep = Array.from(eigen.im.keys()).filter((j) => eigen.im[j] >= 0 && Number.isFinite(eigen.re[j]));
  return { re: Float64Array.from(keep, (j) => eigen.re[j]), im: Float64Array.from(keep, (j) => eigen.im[j]) };
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
  const factor = pencil.factor(re + aside, omega);
  const pair = refineEigenpair(pencil, re, omega, lift(critical.right), lift(critical.left), factor);
  return {
    value: value(pair.re, pair.im),
    omega: Math.abs(pair.im),
    error: pair.residual,
    converged: pair.converged,
    directions: realDirections(pair.right, pair.left),
    found: { kind: "eigenvalue", pair },
  };
}
