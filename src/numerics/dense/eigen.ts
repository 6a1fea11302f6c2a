/** Eigenvalues and eigenvectors of general real matrices. */

import { balancedHessenberg, clearReflectors, inUnits } from "./balanced-hessenberg.js";
import { addTransposedProductInto, type Block } from "./block-kernels.js";
import { hessenbergBasis } from "./hessenberg.js";
import { type ComplexMatrix, complexZeros, type DenseMatrix } from "./matrix.js";
import { realSchur } from "./real-schur.js";
import { leftSchurVectors, rightSchurVectors } from "./schur-vectors.js";

/** Eigenvalues re[j] + i im[j]; of real matrices conjugate pairs are adjacent, positive im first. */
export interface Eigenvalues {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** A X = X Λ and Yᴴ A = Λ Yᴴ. */
export interface Eigen extends Eigenvalues {
  /** Columns x of 2-norm 1. */
  readonly right: ComplexMatrix;
  /** Columns y with yᴴ x = 1, or of norm 1 where `defective`. */
  readonly left: ComplexMatrix;
  /**
   * 1 where |yᴴ x| of unit vectors in balanced coordinates is below its own
   * rounding error, 4 eps max(n, 4): an eigenvalue defective to working accuracy.
   */
  readonly defective: Uint8Array;
}

/**
 * All eigenvalues of a real n×n matrix: balancing, Hessenberg form, double-shift QR.
 * Exact for a matrix within a few eps·‖D⁻¹AD‖ of the balanced one.
 *
 * @throws NumericalError `numerics.not-finite`, `numerics.no-convergence`.
 */
export function eigenvalues(a: DenseMatrix): Eigenvalues {
  const n = a.rows;
  const { h, unit } = balancedHessenberg(a);
  clearReflectors(h, n);
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  realSchur(h, n, null, re, im);
  return inUnits(re, im, unit);
}

/**
 * All eigenvalues with right and left eigenvectors, through the real Schur
 * form A = Z T Zᵀ of the balanced matrix and substitution with T, guarded
 * against overflow. About 30 n³ operations.
 *
 * @throws as `eigenvalues`.
 */
export function eigen(a: DenseMatrix): Eigen {
  const n = a.rows;
  const { h: t, tau, weights, unit } = balancedHessenberg(a);
  const z = hessenbergBasis(t, n, tau);
  clearReflectors(t, n);
  const re = new Float64Array(n);
  const im = new Float64Array(n);
  realSchur(t, n, z, re, im);

  const right = complexZeros(n, n);
  const left = complexZeros(n, n);
  unpack(backTransformed(z, rightSchurVectors(t, n, re, im), n, true), im, right);
  unpack(backTransformed(z, leftSchurVectors(t, n, re, im), n, false), im, left);
  const defective = new Uint8Array(n);
  for (let j = 0; j < n; j++) finishVectors(right, left, j, weights, defective);
  return { ...inUnits(re, im, unit), right, left, defective };
}

/** Z X with X upper (or lower) triangular up to one subdiagonal, by panels of columns that skip the zeros. */
function backTransformed(z: Float64Array, x: Float64Array, n: number, upper: boolean): Float64Array {
  const out = new Float64Array(n * n);
  const width = 32;
  for (let begin = 0; begin < n; begin += width) {
    const cols = Math.min(width, n - begin);
    const first = upper ? 0 : Math.max(0, begin - 1);
    const end = upper ? Math.min(n, begin + cols + 1) : n;
    const target: Block = { values: out, at: begin * n, stride: n };
    const rows: Block = { values: z, at: first, stride: n };
    const vectors: Block = { values: x, at: first + begin * n, stride: n };
    addTransposedProductInto(target, 1, rows, vectors, n, cols, end - first);
  }
  return out;
}

// From real columns, pairs as real and imaginary part, to complex ones.
function unpack(packed: Float64Array, im: Float64Array, out: ComplexMatrix): void {
  const n = out.rows;
  for (let j = 0; j < n; j++) {
    const at = j * n;
    for (let i = 0; i < n; i++) out.re[at + i] = packed[at + i];
    if (im[j] === 0) continue;
    for (let i = 0; i < n; i++) {
      const imaginary = packed[at + n + i];
      out.im[at + i] = imaginary;
      out.re[at + n + i] = packed[at + i];
      out.im[at + n + i] = -imaginary;
    }
    j++;
  }
}

/** Leaves balanced coordinates, x ← D x and y ← D⁻¹ y, and normalises the pair number j. */
function finishVectors(
  right: ComplexMatrix,
  left: ComplexMatrix,
  j: number,
  weights: Float64Array,
  defective: Uint8Array,
): void {
  const n = right.rows;
  const at = j * n;
  normalise(right, at);
  normalise(left, at);
  const overlap = Math.hypot(...inner(left, right, at));
  defective[j] = overlap < 4 * Number.EPSILON * Math.max(n, 4) ? 1 : 0;
  for (let i = 0; i < n; i++) {
    right.re[at + i] *= weights[i];
    right.im[at + i] *= weights[i];
    left.re[at + i] /= weights[i];
    left.im[at + i] /= weights[i];
  }
  normalise(right, at);
  if (defective[j] === 1) {
    normalise(left, at);
    return;
  }
  // y ← y / conj(yᴴ x).
  const [dotRe, dotIm] = inner(left, right, at);
  const size = Math.hypot(dotRe, dotIm);
  const cosine = dotRe / size;
  const sine = dotIm / size;
  for (let i = at; i < at + n; i++) {
    const yRe = left.re[i] / size;
    const yIm = left.im[i] / size;
    left.re[i] = yRe * cosine - yIm * sine;
    left.im[i] = yIm * cosine + yRe * sine;
  }
}

function normalise(a: ComplexMatrix, at: number): void {
  const end = at + a.rows;
  let most = 0;
  for (let i = at; i < end; i++) most = Math.max(most, Math.abs(a.re[i]), Math.abs(a.im[i]));
  let sum = 0;
  for (let i = at; i < end; i++) {
    a.re[i] /= most;
    a.im[i] /= most;
    sum += a.re[i] * a.re[i] + a.im[i] * a.im[i];
  }
  const norm = Math.sqrt(sum);
  for (let i = at; i < end; i++) {
    a.re[i] /= norm;
    a.im[i] /= norm;
  }
}

// yᴴ x of the columns that start at `at`.
function inner(y: ComplexMatrix, x: ComplexMatrix, at: number): [number, number] {
  let re = 0;
  let im = 0;
  for (let i = at; i < at + x.rows; i++) {
    re += y.re[i] * x.re[i] + y.im[i] * x.im[i];
    im += y.re[i] * x.im[i] - y.im[i] * x.re[i];
  }
  return [re, im];
}
