import type { Pencil } from "../model/pencil.js";
import { applyPencil, applyPencilAdjoint, applyPencilDerivative, pencilNorm } from "../model/pencil.js";
import {
  addScaledInto,
  copyOf,
  innerProduct,
  norm2,
  normaliseInPlace,
} from "../numerics/dense/complex-vectors.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import { asColumn } from "./eigenpair.js";

/** A pair (α, ω) with an eigenvalue iω of P(s; α) = P₀(s) + α (N + sF), and its null vectors. */
export interface Crossing {
  readonly alpha: number;
  /** [rad/s]; 0 for divergence. */
  readonly omega: number;
  readonly right: ComplexVector;
  readonly left: ComplexVector;
  readonly residual: number;
  /** The residual is small, and the eigenvalue does enter: undamped modes lie on the axis at every α below their coalescence. */
  readonly converged: boolean;
  /** d Re s / dα [rad/s]: positive when the eigenvalue enters the right half plane. */
  readonly drift: number;
}

const good = 1e-10;
/** Least share of the real part in dλ/dα that is more than rounding. */
const enters = 1e-7;

/**
 * Polishes a crossing on a model by two-sided residual inverse iteration: the scalar complex
 * equation yᴴP(iω; α)x = 0 gives the two real unknowns, one factorisation serves all steps.
 *
 * @param pencilAt - the model as a function of α, affine in it.
 */
export function refineCrossing(
  pencilAt: (multiplier: number) => Pencil,
  alphaGuess: number,
  omegaGuess: number,
  rightGuess: ComplexVector,
  leftGuess: ComplexVector,
): Crossing {
  const without = pencilAt(0);
  const unit = pencilAt(1);
  let pencil = pencilAt(alphaGuess);
  // A guess that is right to the last bit would make the factored matrix singular.
  const factor = pencilAt(alphaGuess * (1 + 1e-7)).factor(0, omegaGuess);
  const x = copyOf(rightGuess);
  const y = copyOf(leftGuess);
  factor.solveInPlace(asColumn(x));
  factor.solveAdjointInPlace(asColumn(y));
  normaliseInPlace(x);
  normaliseInPlace(y);
  let [alpha, omega, drift, speed] = [alphaGuess, omegaGuess, 0, 0];
  let residual = Number.POSITIVE_INFINITY;
  for (let step = 0; step < 25; step++) {
    [alpha, omega, drift, speed] = solveScalar(pencil, without, unit, y, x, alpha, omega);
    pencil = pencilAt(alpha);
    const r = applyPencil(pencil, 0, omega, x);
    const previous = residual;
    // With one dof P itself vanishes at the crossing; the model without feeding does not.
    residual = norm2(r) / Math.max(pencilNorm(pencil, 0, omega), pencilNorm(without, 0, omega));
    if (residual < 1e-14 || (residual > 0.5 * previous && residual < good)) break;
    factor.solveInPlace(asColumn(r));
    addScaledInto(x, -1, 0, r);
    normaliseInPlace(x);
    const q = applyPencilAdjoint(pencil, 0, omega, y);
    factor.solveAdjointInPlace(asColumn(q));
    addScaledInto(y, -1, 0, q);
    normaliseInPlace(y);
  }
  return {
    alpha,
    omega,
    right: x,
    left: y,
    residual,
    converged: residual < good && drift > enters * speed,
    drift,
  };
}

/** One Newton step (with dRe λ/dα and |dλ/dα|) for yᴴP(iω; α)x = 0 in (α, ω), ω held at 0 for divergence. */
function solveScalar(
  pencil: Pencil,
  without: Pencil,
  unit: Pencil,
  y: ComplexVector,
  x: ComplexVector,
  alpha: number,
  omega: number,
): [alpha: number, omega: number, drift: number, speed: number] {
  const f = innerProduct(y, applyPencil(pencil, 0, omega, x));
  const feeding = applyPencil(unit, 0, omega, x);
  addScaledInto(feeding, -1, 0, applyPencil(without, 0, omega, x));
  const fed = innerProduct(y, feeding);
  const slope = innerProduct(y, applyPencilDerivative(pencil, 0, omega, x));
  const slope2 = slope.re * slope.re + slope.im * slope.im;
  const drift = slope2 === 0 ? 0 : -(fed.re * slope.re + fed.im * slope.im) / slope2;
  const speed = slope2 === 0 ? 0 : Math.hypot(fed.re, fed.im) / Math.sqrt(slope2);
  if (omega === 0) {
    const fed2 = fed.re * fed.re + fed.im * fed.im;
    return [alpha - (f.re * fed.re + f.im * fed.im) / fed2, 0, drift, speed];
  }
  // ∂f/∂α = fed, ∂f/∂ω = i·slope.
  const [aRe, aIm, bRe, bIm] = [fed.re, fed.im, -slope.im, slope.re];
  const determinant = aRe * bIm - aIm * bRe;
  if (determinant === 0) return [alpha, omega, drift, speed];
  return [
    alpha - (f.re * bIm - f.im * bRe) / determinant,
    omega - (aRe * f.im - aIm * f.re) / determinant,
    drift,
    speed,
  ];
}
