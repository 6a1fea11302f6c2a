import type { Pencil, PencilFactor } from "../model/pencil.js";
import { applyPencil, pencilNorm } from "../model/pencil.js";
import { addComplexProductInto } from "../numerics/dense/complex-block-kernels.js";
import { complexEigenvalues } from "../numerics/dense/complex-eigen.js";
import { norm2, normaliseInPlace } from "../numerics/dense/complex-vectors.js";
import { factorDenseComplex } from "../numerics/dense/lu.js";
import { type ComplexMatrix, type ComplexVector, complexVector } from "../numerics/dense/matrix.js";
import { CompanionKrylov } from "./companion-krylov.js";
import { asColumn } from "./eigenpair.js";

/** One eigenvalue found near a shift, with its right vector (unit length) and its residual. */
export interface NearbyEigenvalue {
  readonly re: number;
  readonly im: number;
  readonly right: ComplexVector;
  /** ‖P(λ)x‖ / (‖P‖ ‖x‖). */
  readonly residual: number;
}

/** All eigenvalues within `radius` of the shift, as far as the Krylov space tells. */
export interface Neighbourhood {
  readonly shiftRe: number;
  readonly shiftIm: number;
  readonly radius: number;
  /** Nearest first. */
  readonly eigenvalues: readonly NearbyEigenvalue[];
}

const converged = 1e-9;
/** Solves between two looks at a disc that does not reach as far as it should. */
const stride = 8;

/** How much is spent on one disc. */
export interface DiscEffort {
  /** Solves, so the dimension of the Krylov space. */
  readonly steps: number;
  /** More of them follow until the disc has this radius [rad/s] … */
  readonly reach: number;
  /** … or so many were made. */
  readonly mostSteps: number;
}

export const discDefaults: DiscEffort = { steps: 28, reach: 0, mostSteps: 28 };

/**
 * Eigenvalues of P nearest to a shift σ by shift-and-invert Arnoldi on the first companion form, one
 * factorisation and one solve a step. It knows nothing of the reduced model, so what it finds is
 * a judgement of the full model by itself.
 *
 * @param scale - s₀ [rad/s] that makes the two halves of the companion vector comparable.
 *
 * Source: Tisseur & Meerbergen, SIAM Review 43 (2001) §5; Saad, Numerical Methods for Large Eigenvalue Problems, ch. 6.
 */
export function nearbyEigenvalues(
  pencil: Pencil,
  factor: PencilFactor,
  scale: number,
  seed: number,
  { steps, reach, mostSteps }: DiscEffort = discDefaults,
): Neighbourhood {
  const space = new CompanionKrylov(pencil, factor, scale, seed, mostSteps);
  space.expand(steps);
  let area = convergedAround(pencil, factor, space);
  while (area.radius < reach && !space.exhausted && !space.full) {
    space.expand(stride);
    area = convergedAround(pencil, factor, space);
  }
  return area;
}

/** The Ritz values nearest to the shift up to the first one that has not converged. */
function convergedAround(pencil: Pencil, factor: PencilFactor, space: CompanionKrylov): Neighbourhood {
  const hessenberg = space.hessenberg();
  const theta = complexEigenvalues(hessenberg);
  const order = Array.from(theta.re.keys()).sort(
    (a, b) => Math.hypot(theta.re[b], theta.im[b]) - Math.hypot(theta.re[a], theta.im[a]),
  );
  const eigenvalues: NearbyEigenvalue[] = [];
  let radius = Number.POSITIVE_INFINITY;
  for (const j of order) {
    const size2 = theta.re[j] ** 2 + theta.im[j] ** 2;
    if (size2 === 0) break;
    const re = factor.sRe + theta.re[j] / size2;
    const im = factor.sIm - theta.im[j] / size2;
    const right = ritzVector(space.basis, hessenberg, theta.re[j], theta.im[j]);
    const residual = norm2(applyPencil(pencil, re, im, right)) / pencilNorm(pencil, re, im);
    if (residual > converged) {
      // What this Ritz value stands for may lie nearer than it does, all the more where nothing has converged yet.
      radius = (eigenvalues.length === 0 ? 0.5 : 0.9) / Math.sqrt(size2);
      break;
    }
    eigenvalues.push({ re, im, right, residual });
  }
  const last = eigenvalues[eigenvalues.length - 1];
  // Just inside the last one found: a twin of it may still be missing.
  if (last !== undefined && !space.exhausted) {
    radius = Math.min(radius, 0.999 * Math.hypot(last.re - factor.sRe, last.im - factor.sIm));
  }
  return { shiftRe: factor.sRe, shiftIm: factor.sIm, radius, eigenvalues };
}

/** Eigenvector of the Hessenberg matrix by two steps of inverse iteration, lifted to the displacements. */
function ritzVector(
  basis: ComplexMatrix,
  hessenberg: ComplexMatrix,
  thetaRe: number,
  thetaIm: number,
): ComplexVector {
  const k = hessenberg.rows;
  const shifted = { rows: k, cols: k, re: hessenberg.re.slice(), im: hessenberg.im.slice() };
  for (let i = 0; i < k; i++) {
    shifted.re[i * (k + 1)] -= thetaRe;
    shifted.im[i * (k + 1)] -= thetaIm;
  }
  const lu = factorDenseComplex(shifted);
  const weights = complexVector(k);
  weights.re.fill(1);
  for (let pass = 0; pass < 2; pass++) {
    lu.solveInPlace(asColumn(weights));
    normaliseInPlace(weights);
  }
  const n = basis.rows / 2;
  const right = complexVector(n);
  const displacements = { ...basis, at: 0, stride: basis.rows };
  addComplexProductInto(
    { ...right, at: 0, stride: n },
    1,
    displacements,
    { ...weights, at: 0, stride: k },
    n,
    1,
    k,
  );
  normaliseInPlace(right);
  return right;
}
