import type { Pencil, PencilFactor } from "../model/pencil.js";
import { applyPencil, pencilNorm } from "../model/pencil.js";
import { complexEigenvalues } from "../numerics/dense/complex-eigen.js";
import {
  addScaledInto,
  innerProduct,
  norm2,
  normaliseInPlace,
  scaleInPlace,
} from "../numerics/dense/complex-vectors.js";
import { factorDenseComplex } from "../numerics/dense/lu.js";
import {
  type ComplexMatrix,
  type ComplexVector,
  complexColumn,
  complexVector,
  complexZeros,
} from "../numerics/dense/matrix.js";
import { complexMultiply } from "../numerics/dense/products.js";
import { createRandom } from "../numerics/random.js";
import { applyComplex } from "../numerics/real-operator.js";
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

const steps = 28;
const converged = 1e-9;

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
): Neighbourhood {
  const space = krylovSpace(pencil, factor, scale, seed);
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
  /** Upper halves (displacements) of the basis vectors, n×k. */
  readonly displacements: ComplexMatrix;
  readonly hessenberg: ComplexMatrix;
  /** The space closed: its eigenvalues are all there are. */
  readonly exhausted: boolean;
}

function krylovSpace(pencil: Pencil, factor: PencilFactor, scale: number, seed: number): KrylovSpace {
  const n = pencil.order;
  const most = Math.min(steps, 2 * n);
  const basis: ComplexVector[] = [];
  const h = complexZeros(most, most);
  const random = createRandom(seed);
  const start = complexVector(2 * n);
  for (let i = 0; i < 2 * n; i++) start.re[i] = random.normal();
  // Pushed through the operator once: the start then has no part in the infinite eigenvalues.
  let next = applyOperator(pencil, factor, scale, start);
  normaliseInPlace(next);
  let exhausted = most === 2 * n;
  let k = 0;
  while (k < most) {
    basis.push(next);
    next = applyOperator(pencil, factor, scale, next);
    const before = norm2(next);
    for (let pass = 0; pass < 2; pass++) {
      basis.forEach((q, i) => {
        const c = innerProduct(q, next);
        addScaledInto(next, -c.re, -c.im, q);
        h.re[i + k * most] += c.re;
        h.im[i + k * most] += c.im;
      });
    }
    const left = normaliseInPlace(next);
    k++;
    if (left <= 1e-13 * before) {
      exhausted = true;
      break;
    }
    if (k < most) h.re[k + (k - 1) * most] = left;
  }
  return { displacements: upperHalves(basis, n), hessenberg: leadingBlock(h, k), exhausted };
}

/** z ← (A − σE)⁻¹ E z with z = [q; q̇/s₀]: x = −P(σ)⁻¹(M z₂ s₀ + (C + σM) z₁), then [x; (z₁ + σx)/s₀]. */
function applyOperator(pencil: Pencil, factor: PencilFactor, scale: number, z: ComplexVector): ComplexVector {
  const n = pencil.order;
  const { sRe, sIm } = factor;
  const z1 = { re: z.re.subarray(0, n), im: z.im.subarray(0, n) };
  const z2 = { re: z.re.subarray(n), im: z.im.subarray(n) };
  const sum = complexVector(n);
  addScaledInto(sum, scale, 0, z2);
  addScaledInto(sum, sRe, sIm, z1);
  const load = applyComplex(pencil.mass, sum);
  addScaledInto(load, 1, 0, applyComplex(pencil.velocity, z1));
  factor.solveInPlace(asColumn(load));
  const out = complexVector(2 * n);
  const top = { re: out.re.subarray(0, n), im: out.im.subarray(0, n) };
  const bottom = { re: out.re.subarray(n), im: out.im.subarray(n) };
  addScaledInto(top, -1, 0, load);
  addScaledInto(bottom, 1, 0, z1);
  addScaledInto(bottom, sRe, sIm, top);
  scaleInPlace(bottom, 1 / scale, 0);
  return out;
}

/** Eigenvector of the Hessenberg matrix by two steps of inverse iteration, lifted to the displacements. */
function ritzVector(space: KrylovSpace, thetaRe: number, thetaIm: number): ComplexVector {
  const { hessenberg, displacements } = space;
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
  const x = complexMultiply(displacements, asColumn(weights));
  const right = { re: x.re, im: x.im };
  normaliseInPlace(right);
  return right;
}

function upperHalves(basis: readonly ComplexVector[], n: number): ComplexMatrix {
  const out = complexZeros(n, basis.length);
  basis.forEach((z, k) => {
    complexColumn(out, k).re.set(z.re.subarray(0, n));
    complexColumn(out, k).im.set(z.im.subarray(0, n));
  });
  return out;
}

function leadingBlock(h: ComplexMatrix, k: number): ComplexMatrix {
  const out = complexZeros(k, k);
  for (let j = 0; j < k; j++) {
    out.re.set(h.re.subarray(j * h.rows, j * h.rows + k), j * k);
    out.im.set(h.im.subarray(j * h.rows, j * h.rows + k), j * k);
  }
  return out;
}
