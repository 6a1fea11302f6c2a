import type { Pencil, PencilFactor } from "../model/pencil.js";
import { applyPencil, pencilNorm } from "../model/pencil.js";
import { addComplexProductInto } from "../numerics/dense/complex-block-kernels.js";
import { complexEigenvalues } from "../numerics/dense/complex-eigen.js";
import { orthogonaliseInPlace } from "../numerics/dense/complex-gram-schmidt.js";
import { norm2, normaliseInPlace } from "../numerics/dense/complex-vectors.js";
import { factorDenseComplex } from "../numerics/dense/lu.js";
import {
  type ComplexMatrix,
  type ComplexVector,
  complexColumn,
  complexVector,
  complexZeros,
} from "../numerics/dense/matrix.js";
import { createRandom } from "../numerics/random.js";
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

/** Solves for one disc where nothing else is asked for. */
const usualSteps = 28;
const converged = 1e-9;

/**
 * Eigenvalues of P nearest to a shift σ by shift-and-invert Arnoldi on the first companion form, one
 * factorisation and one solve a step. It knows nothing of the reduced model, so what it finds is
 * a judgement of the full model by itself.
 *
 * @param scale - s₀ [rad/s] that makes the two halves of the companion vector comparable.
 * @param steps - Solves, so the dimension of the Krylov space: more of them make a wider disc.
 *
 * Source: Tisseur & Meerbergen, SIAM Review 43 (2001) §5; Saad, Numerical Methods for Large Eigenvalue Problems, ch. 6.
 */
export function nearbyEigenvalues(
  pencil: Pencil,
  factor: PencilFactor,
  scale: number,
  seed: number,
  steps: number = usualSteps,
): Neighbourhood {
  const space = krylovSpace(pencil, factor, scale, seed, steps);
  const theta = complexEigenvalues(space.hessenberg);
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
    const right = ritzVector(space, theta.re[j], theta.im[j]);
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

interface KrylovSpace {
  /** The basis, one column more than `hessenberg` has, at least: displacements above velocities over s₀, 2n rows. */
  readonly basis: ComplexMatrix;
  readonly hessenberg: ComplexMatrix;
  /** The space closed: its eigenvalues are all there are. */
  readonly exhausted: boolean;
}

function krylovSpace(
  pencil: Pencil,
  factor: PencilFactor,
  scale: number,
  seed: number,
  steps: number,
): KrylovSpace {
  const rows = 2 * pencil.order;
  const most = Math.min(steps, rows);
  const v = complexZeros(rows, most + 1);
  const h = complexZeros(most, most);
  const room = roomFor(pencil.order);
  const random = createRandom(seed);
  const start = complexVector(rows);
  for (let i = 0; i < rows; i++) start.re[i] = random.normal();
  // Pushed through the operator once: the start then has no part in the infinite eigenvalues.
  applyOperatorInto(complexColumn(v, 0), pencil, factor, scale, start, room);
  normaliseInPlace(complexColumn(v, 0));
  let exhausted = most === rows;
  let k = 0;
  while (k < most) {
    const next = complexColumn(v, k + 1);
    applyOperatorInto(next, pencil, factor, scale, complexColumn(v, k), room);
    const before = norm2(next);
    k++;
    orthogonaliseInPlace(next, v, k, complexColumn(h, k - 1));
    const left = normaliseInPlace(next);
    if (left <= 1e-13 * before) {
      exhausted = true;
      break;
    }
    if (k < most) h.re[k + (k - 1) * most] = left;
  }
  return { basis: v, hessenberg: leadingBlock(h, k), exhausted };
}

/** Vectors of length n that every step uses anew. */
interface Room {
  readonly sum: ComplexVector;
  readonly load: ComplexVector;
}

function roomFor(n: number): Room {
  return { sum: complexVector(n), load: complexVector(n) };
}

/** out ← (A − σE)⁻¹ E z with z = [q; q̇/s₀]: x = −P(σ)⁻¹(M z₂ s₀ + (C + σM) z₁), then [x; (z₁ + σx)/s₀]. */
function applyOperatorInto(
  out: ComplexVector,
  pencil: Pencil,
  factor: PencilFactor,
  scale: number,
  z: ComplexVector,
  { sum, load }: Room,
): void {
  const n = pencil.order;
  const { sRe, sIm } = factor;
  const { re: zRe, im: zIm } = z;
  for (let i = 0; i < n; i++) {
    sum.re[i] = scale * zRe[n + i] + sRe * zRe[i] - sIm * zIm[i];
    sum.im[i] = scale * zIm[n + i] + sRe * zIm[i] + sIm * zRe[i];
  }
  load.re.fill(0);
  load.im.fill(0);
  pencil.mass.addInto(load, 1, 0, sum);
  pencil.velocity.addInto(load, 1, 0, { re: zRe.subarray(0, n), im: zIm.subarray(0, n) });
  factor.solveInPlace(asColumn(load));
  for (let i = 0; i < n; i++) {
    const xRe = -load.re[i];
    const xIm = -load.im[i];
    out.re[i] = xRe;
    out.im[i] = xIm;
    out.re[n + i] = (zRe[i] + sRe * xRe - sIm * xIm) / scale;
    out.im[n + i] = (zIm[i] + sRe * xIm + sIm * xRe) / scale;
  }
}

/** Eigenvector of the Hessenberg matrix by two steps of inverse iteration, lifted to the displacements. */
function ritzVector(space: KrylovSpace, thetaRe: number, thetaIm: number): ComplexVector {
  const { hessenberg, basis } = space;
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

function leadingBlock(h: ComplexMatrix, k: number): ComplexMatrix {
  const out = complexZeros(k, k);
  for (let j = 0; j < k; j++) {
    out.re.set(h.re.subarray(j * h.rows, j * h.rows + k), j * k);
    out.im.set(h.im.subarray(j * h.rows, j * h.rows + k), j * k);
  }
  return out;
}
