import type { Pencil, PencilFactor } from "../model/pencil.js";
import { norm2, normaliseInPlace } from "../numerics/dense/complex-vectors.js";
import {
  type ComplexMatrix,
  type ComplexVector,
  complexColumn,
  complexVector,
  complexZeros,
} from "../numerics/dense/matrix.js";
import { complexMultiply } from "../numerics/dense/products.js";
import { largestSingular } from "../numerics/dense/svd.js";
import { createRandom } from "../numerics/random.js";
import { applyComplex, applyComplexTransposed } from "../numerics/real-operator.js";
import { asColumn } from "./eigenpair.js";

/** The largest singular triplet of H(s) at one s, with the responses that belong to it. */
export interface ChannelGain {
  readonly sRe: number;
  readonly sIm: number;
  readonly sigma: number;
  /** Output direction, length p, unit. */
  readonly u: ComplexVector;
  /** Input direction, length m, unit: H v = σ u. */
  readonly v: ComplexVector;
  /** x = P⁻¹ B diag(s^k) v. */
  readonly x: ComplexVector;
  /** y = P⁻ᴴ Cᵀ u. */
  readonly y: ComplexVector;
  readonly backwardError: number;
  /** False when the directions ran out before σ stood still: it is a lower bound then. */
  readonly settled: boolean;
}

/** Channels up to this many are solved at once; wider ones by directions. */
const solveAllUpTo = 24;

/** Directions tried on wide channels at most: convergence is far quicker unless many gains are nearly equal. */
const mostDirections = 60;

/** σ_max(H(s)) on the factored pencil. */
export function channelGain(pencil: Pencil, factor: PencilFactor): ChannelGain {
  if (pencil.input.cols <= solveAllUpTo) return gainFromAllInputs(pencil, factor);
  return gainFromDirections(pencil, factor);
}

/** y = B diag(s^k) v. */
export function applyInput(pencil: Pencil, sRe: number, sIm: number, v: ComplexVector): ComplexVector {
  return applyComplex(pencil.input, scaledByPowers(pencil.powers, sRe, sIm, v));
}

/** z = (B diag(s^k))ᴴ y. */
function applyInputAdjoint(pencil: Pencil, sRe: number, sIm: number, y: ComplexVector): ComplexVector {
  return scaledByPowers(pencil.powers, sRe, -sIm, applyComplexTransposed(pencil.input, y));
}

function scaledByPowers(powers: Uint8Array, sRe: number, sIm: number, v: ComplexVector): ComplexVector {
  const out = complexVector(powers.length);
  for (let k = 0; k < powers.length; k++) {
    out.re[k] = powers[k] === 0 ? v.re[k] : sRe * v.re[k] - sIm * v.im[k];
    out.im[k] = powers[k] === 0 ? v.im[k] : sRe * v.im[k] + sIm * v.re[k];
  }
  return out;
}

function gainFromAllInputs(pencil: Pencil, factor: PencilFactor): ChannelGain {
  const { sRe, sIm } = factor;
  const inputs = pencil.input.cols;
  const responses = complexZeros(pencil.order, inputs);
  for (let k = 0; k < inputs; k++) {
    const unit = complexVector(inputs);
    unit.re[k] = 1;
    const b = applyInput(pencil, sRe, sIm, unit);
    complexColumn(responses, k).re.set(b.re);
    complexColumn(responses, k).im.set(b.im);
  }
  const forward = factor.solveInPlace(responses);
  const h = outputsOf(pencil, responses);
  const { sigma, u, v } = largestSingular(h);
  const x = complexMultiply(responses, asColumn(v));
  const { y, backwardError } = adjointResponse(pencil, factor, u);
  return {
    sRe,
    sIm,
    sigma,
    u,
    v,
    x: { re: x.re, im: x.im },
    y,
    backwardError: Math.max(forward, backwardError),
    settled: true,
  };
}

/**
 * Golub–Kahan–Lanczos bidiagonalisation of H, full reorthogonalisation, until the largest singular value stands
 * still or the directions are exhausted. It starts from Hᴴ of a random output: a regular start such as ones can be
 * blind to the strongest direction by symmetry, and one outside the range of Hᴴ costs a direction more.
 */
function gainFromDirections(pencil: Pencil, factor: PencilFactor): ChannelGain {
  const { sRe, sIm } = factor;
  const outputs = pencil.outputTransposed.cols;
  const most = Math.min(pencil.input.cols, outputs, mostDirections);
  const directions: ComplexVector[] = [];
  const responses: ComplexVector[] = [];
  const back = (u: ComplexVector) =>
    applyInputAdjoint(pencil, sRe, sIm, adjointResponse(pencil, factor, u).y);
  let next = back(randomVector(outputs));
  let backwardError = 0;
  let sigma = 0;
  let settled = most < mostDirections;
  while (directions.length < most && orthonormaliseAgainst(next, directions)) {
    directions.push(next);
    const x = applyInput(pencil, sRe, sIm, next);
    backwardError = Math.max(backwardError, factor.solveInPlace(asColumn(x)));
    responses.push(x);
    const best = largestSingular(outputsOf(pencil, sideBySide(pencil.order, responses)));
    const change = Math.abs(best.sigma - sigma);
    settled ||= change <= 1e-10 * best.sigma;
    if (change <= 1e-13 * best.sigma) break;
    sigma = best.sigma;
    next = back(best.u);
  }
  const all = sideBySide(pencil.order, responses);
  const best = largestSingular(outputsOf(pencil, all));
  const adjoint = adjointResponse(pencil, factor, best.u);
  return {
    sRe,
    sIm,
    sigma: best.sigma,
    u: best.u,
    v: complexMultiply(sideBySide(pencil.input.cols, directions), asColumn(best.v)),
    x: complexMultiply(all, asColumn(best.v)),
    y: adjoint.y,
    backwardError: Math.max(backwardError, adjoint.backwardError),
    settled: settled || directions.length < most,
  };
}

function outputsOf(pencil: Pencil, responses: ComplexMatrix): ComplexMatrix {
  const h = complexZeros(pencil.outputTransposed.cols, responses.cols);
  for (let k = 0; k < responses.cols; k++) {
    const z = applyComplexTransposed(pencil.outputTransposed, complexColumn(responses, k));
    complexColumn(h, k).re.set(z.re);
    complexColumn(h, k).im.set(z.im);
  }
  return h;
}

function adjointResponse(pencil: Pencil, factor: PencilFactor, u: ComplexVector) {
  const y = applyComplex(pencil.outputTransposed, u);
  const backwardError = factor.solveAdjointInPlace(asColumn(y));
  return { y, backwardError };
}

function orthonormaliseAgainst(w: ComplexVector, kept: readonly ComplexVector[]): boolean {
  const original = norm2(w);
  for (let pass = 0; pass < 2; pass++) {
    for (const q of kept) {
      let re = 0;
      let im = 0;
      for (let i = 0; i < w.re.length; i++) {
        re += q.re[i] * w.re[i] + q.im[i] * w.im[i];
        im += q.re[i] * w.im[i] - q.im[i] * w.re[i];
      }
      for (let i = 0; i < w.re.length; i++) {
        w.re[i] -= re * q.re[i] - im * q.im[i];
        w.im[i] -= re * q.im[i] + im * q.re[i];
      }
    }
  }
  const left = normaliseInPlace(w);
  return left > 1e-12 * original;
}

function sideBySide(rows: number, columns: readonly ComplexVector[]): ComplexMatrix {
  const out = complexZeros(rows, columns.length);
  columns.forEach((x, k) => {
    out.re.set(x.re, k * rows);
    out.im.set(x.im, k * rows);
  });
  return out;
}

function randomVector(length: number): ComplexVector {
  const random = createRandom(length);
  const out = complexVector(length);
  for (let i = 0; i < length; i++) [out.re[i], out.im[i]] = [random.normal(), random.normal()];
  return out;
}
