import type { Pencil, PencilFactor } from "../model/pencil.js";
import { applyPencil, applyPencilAdjoint, applyPencilDerivative, pencilNorm } from "../model/pencil.js";
import {
  addScaledInto,
  copyOf,
  innerProduct,
  norm2,
  normaliseInPlace,
} from "../numerics/dense/complex-vectors.js";
import type { ComplexMatrix, ComplexVector } from "../numerics/dense/matrix.js";
import { applyComplex } from "../numerics/real-operator.js";

/** An eigenvalue λ of P with right and left vectors, P(λ)x = 0 and yᴴP(λ) = 0, both of unit length. */
export interface Eigenpair {
  readonly re: number;
  readonly im: number;
  readonly right: ComplexVector;
  readonly left: ComplexVector;
  /** ‖P(λ)x‖ / (‖P‖ ‖x‖). */
  readonly residual: number;
  readonly converged: boolean;
}

const tolerance = 1e-13;
const good = 1e-10;
const stepsPerFactor = 10;

/**
 * Two-sided residual inverse iteration from an approximate eigenpair. The factorisation may serve
 * several neighbouring eigenvalues: convergence is linear with the distance from its shift.
 *
 * Source: Neumaier, SIAM J. Numer. Anal. 22 (1985); two-sided Rayleigh functional after Schreiber 2008.
 */
export function refineEigenpair(
  pencil: Pencil,
  guessRe: number,
  guessIm: number,
  rightGuess: ComplexVector,
  leftGuess: ComplexVector,
  factor: PencilFactor,
): Eigenpair {
  // One step of plain inverse iteration first: it damps what a reduced basis cannot represent.
  const x = applyPencilDerivative(pencil, guessRe, guessIm, rightGuess);
  factor.solveInPlace(asColumn(x));
  const y = copyOf(leftGuess);
  factor.solveAdjointInPlace(asColumn(y));
  normaliseInPlace(x);
  normaliseInPlace(y);
  let [re, im] = [guessRe, guessIm];
  let residual = Number.POSITIVE_INFINITY;
  // At a rigid motion λ = 0 of a free body ‖P(λ)‖ itself may vanish.
  const nearNorm = pencilNorm(pencil, factor.sRe, factor.sIm);
  for (let step = 0; step < stepsPerFactor; step++) {
    [re, im] = rayleighRoot(pencil, y, x, re, im);
    const r = applyPencil(pencil, re, im, x);
    const previous = residual;
    residual = norm2(r) / Math.max(pencilNorm(pencil, re, im), nearNorm);
    if (residual < tolerance || (residual > 0.5 * previous && residual < good)) break;
    correct(x, r, (b) => factor.solveInPlace(b));
    correct(y, applyPencilAdjoint(pencil, re, im, y), (b) => factor.solveAdjointInPlace(b));
  }
  return { re, im, right: x, left: y, residual, converged: residual < good };
}

/** Root s near the start of yᴴP(s)x = a s² + b s + c, by Newton steps; the start itself when they fail. */
function rayleighRoot(
  pencil: Pencil,
  y: ComplexVector,
  x: ComplexVector,
  startRe: number,
  startIm: number,
): [number, number] {
  const a = innerProduct(y, applyComplex(pencil.mass, x));
  const b = innerProduct(y, applyComplex(pencil.velocity, x));
  const c = innerProduct(y, applyComplex(pencil.displacement, x));
  let [re, im] = [startRe, startIm];
  for (let step = 0; step < 20; step++) {
    const twoRe = a.re * re - a.im * im + b.re;
    const twoIm = a.re * im + a.im * re + b.im;
    const fRe = twoRe * re - twoIm * im + c.re;
    const fIm = twoRe * im + twoIm * re + c.im;
    const slopeRe = twoRe + a.re * re - a.im * im;
    const slopeIm = twoIm + a.re * im + a.im * re;
    const slope2 = slopeRe * slopeRe + slopeIm * slopeIm;
    if (slope2 === 0) break;
    const stepRe = (fRe * slopeRe + fIm * slopeIm) / slope2;
    const stepIm = (fIm * slopeRe - fRe * slopeIm) / slope2;
    re -= stepRe;
    im -= stepIm;
    if (Math.hypot(stepRe, stepIm) <= 1e-16 * Math.hypot(re, im)) break;
  }
  return Number.isFinite(re) && Number.isFinite(im) ? [re, im] : [startRe, startIm];
}

function correct(x: ComplexVector, residual: ComplexVector, solve: (b: ComplexMatrix) => number): void {
  solve(asColumn(residual));
  addScaledInto(x, -1, 0, residual);
  normaliseInPlace(x);
}

/** A view of a vector as an n×1 matrix. */
export function asColumn(x: ComplexVector): ComplexMatrix {
  return { rows: x.re.length, cols: 1, re: x.re, im: x.im };
}
