import type { ComplexMatrix, ComplexVector } from "../numerics/dense/matrix.js";
import { complexVector } from "../numerics/dense/matrix.js";
import type { RealOperator } from "../numerics/real-operator.js";
import { addPencilProductInto } from "../numerics/sparse/real-sparse-products.js";

/** P(s) factored at one s. Both solves overwrite their argument (n×k). */
export interface PencilFactor {
  readonly sRe: number;
  readonly sIm: number;
  /** b ← P(s)⁻¹ b. Returns the worst backward error. */
  solveInPlace(b: ComplexMatrix): number;
  /** b ← P(s)⁻ᴴ b. Returns the worst backward error. */
  solveAdjointInPlace(b: ComplexMatrix): number;
  /** Its memory may serve the next factorisation; it is not used any more. */
  release(): void;
}

/** Work with P(s) factored, s = re + i im, and released afterwards. */
export function withFactor<Result>(
  pencil: Pencil,
  re: number,
  im: number,
  work: (factor: PencilFactor) => Result,
): Result {
  const factor = pencil.factor(re, im);
  try {
    return work(factor);
  } finally {
    factor.release();
  }
}

/**
 * P(s) = s²M + sC + S at one state, with the channels through which model errors enter:
 *
 *     P(s) + B diag(s^k) Δ C,      H(s) = C P(s)⁻¹ B diag(s^k)
 *
 * M is the mass; C (`velocity`) is D + G + F; S (`displacement`) is K + N. Full and reduced
 * models both come as pencils, so the margins cannot tell which they hold.
 */
export interface Pencil {
  readonly order: number;
  readonly mass: RealOperator;
  readonly velocity: RealOperator;
  readonly displacement: RealOperator;
  /** B, n×m. */
  readonly input: RealOperator;
  /** k of each column of B. */
  readonly powers: Uint8Array;
  /** Cᵀ, n×p. */
  readonly outputTransposed: RealOperator;
  factor(sRe: number, sIm: number): PencilFactor;
}

/** y = P(s) x, a new vector. */
export function applyPencil(pencil: Pencil, sRe: number, sIm: number, x: ComplexVector): ComplexVector {
  return combine(pencil, sRe * sRe - sIm * sIm, 2 * sRe * sIm, sRe, sIm, 1, x);
}

/** y = P(s)ᴴ x, a new vector. */
export function applyPencilAdjoint(
  pencil: Pencil,
  sRe: number,
  sIm: number,
  x: ComplexVector,
): ComplexVector {
  const y = complexVector(pencil.order);
  pencil.mass.addTransposedInto(y, sRe * sRe - sIm * sIm, -2 * sRe * sIm, x);
  pencil.velocity.addTransposedInto(y, sRe, -sIm, x);
  pencil.displacement.addTransposedInto(y, 1, 0, x);
  return y;
}

/** y = P′(s) x = (2sM + C) x, a new vector. */
export function applyPencilDerivative(
  pencil: Pencil,
  sRe: number,
  sIm: number,
  x: ComplexVector,
): ComplexVector {
  return combine(pencil, 2 * sRe, 2 * sIm, 1, 0, 0, x);
}

/** Upper bound of ‖P(s)‖₂ from norms of its three matrices. */
export function pencilNorm(pencil: Pencil, sRe: number, sIm: number): number {
  const size = Math.hypot(sRe, sIm);
  const { mass, velocity, displacement } = pencil;
  return size * size * mass.normBound + size * velocity.normBound + displacement.normBound;
}

/** (a M + b C + c S) x with complex a, b and real c. */
function combine(
  pencil: Pencil,
  aRe: number,
  aIm: number,
  bRe: number,
  bIm: number,
  c: number,
  x: ComplexVector,
): ComplexVector {
  const { order, mass, velocity, displacement } = pencil;
  const y = complexVector(order);
  const [m, v, s] = [mass.sparse, velocity.sparse, displacement.sparse];
  if (c !== 0 && m !== null && m.rowIndex === v?.rowIndex && m.rowIndex === s?.rowIndex) {
    addPencilProductInto(y, [aRe, aIm, bRe, bIm, c], m, v, s, x);
    return y;
  }
  mass.addInto(y, aRe, aIm, x);
  velocity.addInto(y, bRe, bIm, x);
  if (c !== 0) displacement.addInto(y, c, 0, x);
  return y;
}
