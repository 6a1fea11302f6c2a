/** Singular values of complex matrices of any shape. */

import { addAdjointProductInto } from "./complex-block-kernels.js";
import { powerOfTwoAbove, requireFiniteMaximum } from "./finite.js";
import { applyReflectors, hermitianTridiagonal } from "./hermitian-tridiagonal.js";
import { type ComplexMatrix, type ComplexVector, complexVector, complexZeros } from "./matrix.js";
import { tridiagonalQl } from "./tridiagonal-eigen.js";

/** The largest singular value with its vectors: H v = σ u, Hᴴ u = σ v. */
export interface LargestSingular {
  readonly sigma: number;
  /** Unit vector, one entry per row. */
  readonly u: ComplexVector;
  /** Unit vector, one entry per column. */
  readonly v: ComplexVector;
}

/**
 * Largest singular value and vectors, from the eigenvalues of the smaller of
 * HᴴH and HHᴴ: for the largest one this keeps full relative accuracy.
 * A zero matrix gives σ = 0 with first unit vectors; a side of length 0 an empty vector.
 *
 * @throws NumericalError `numerics.not-finite`.
 */
export function largestSingular(h: ComplexMatrix): LargestSingular {
  if (h.cols > h.rows) {
    const { sigma, u, v } = largestSingular(adjoint(h));
    return { sigma, u: v, v: u };
  }
  const { rows, cols: n } = h;
  const u = complexVector(rows);
  const v = complexVector(n);
  if (rows > 0) u.re[0] = 1;
  if (n > 0) v.re[0] = 1;
  const { gram, scale } = smallerGram(h);
  if (n === 0 || scale === 0) return { sigma: 0, u, v };

  const { d, e, vectors, tau } = hermitianTridiagonal(gram);
  const z = new Float64Array(n * n);
  for (let i = 0; i < n; i++) z[i + i * n] = 1;
  tridiagonalQl(d, e, n, z, n);
  const top = d.indexOf(d.reduce((most, x) => Math.max(most, x)));
  for (let i = 0; i < n; i++) v.re[i] = z[i * n + top];
  applyReflectors(vectors, tau, v);
  normalise(v);
  multiplyInto(u, h, v, scale);
  return { sigma: normalise(u) * scale, u, v };
}

/** Largest singular value alone; 0 for an empty matrix. As `largestSingular` otherwise. */
export function largestSingularValue(h: ComplexMatrix): number {
  const { gram, scale } = smallerGram(h);
  if (scale === 0) return 0;
  if (gram.rows === 1) return Math.sqrt(gram.re[0]) * scale;
  const { d, e } = hermitianTridiagonal(gram);
  tridiagonalQl(d, e, gram.rows, null, 0);
  let most = 0;
  for (let i = 0; i < d.length; i++) if (d[i] > most) most = d[i];
  return Math.sqrt(most) * scale;
}

/** HᴴH or HHᴴ, whichever is smaller, of H / scale; scale 0 for a zero or empty H. */
function smallerGram(h: ComplexMatrix): { gram: ComplexMatrix; scale: number } {
  const what = "A matrix whose singular values are wanted";
  const most = Math.max(requireFiniteMaximum(h.re, what), requireFiniteMaximum(h.im, what));
  const source = h.cols > h.rows ? adjoint(h) : h;
  const { rows, cols: n } = source;
  const gram = complexZeros(n, n);
  if (most === 0) return { gram, scale: 0 };
  // Squares of entries beyond these bounds could overflow or lose digits; rescaling would copy H for nothing.
  const safe = most < 1e100 && most > 1e-100;
  const scale = safe ? 1 : powerOfTwoAbove(most);
  const x = safe ? source : scaled(source, scale);
  const block = { re: x.re, im: x.im, at: 0, stride: rows };
  addAdjointProductInto({ re: gram.re, im: gram.im, at: 0, stride: n }, 1, block, block, n, n, rows);
  return { gram, scale };
}

function scaled(h: ComplexMatrix, scale: number): ComplexMatrix {
  return { rows: h.rows, cols: h.cols, re: h.re.map((x) => x / scale), im: h.im.map((x) => x / scale) };
}

function adjoint(h: ComplexMatrix): ComplexMatrix {
  const out = complexZeros(h.cols, h.rows);
  for (let j = 0; j < h.cols; j++) {
    for (let i = 0; i < h.rows; i++) {
      out.re[j + i * h.cols] = h.re[i + j * h.rows];
      out.im[j + i * h.cols] = -h.im[i + j * h.rows];
    }
  }
  return out;
}

// y ← H x / scale.
function multiplyInto(y: ComplexVector, h: ComplexMatrix, x: ComplexVector, scale: number): void {
  y.re.fill(0);
  y.im.fill(0);
  for (let j = 0; j < h.cols; j++) {
    const xRe = x.re[j];
    const xIm = x.im[j];
    for (let i = 0; i < h.rows; i++) {
      const hRe = h.re[i + j * h.rows] / scale;
      const hIm = h.im[i + j * h.rows] / scale;
      y.re[i] += hRe * xRe - hIm * xIm;
      y.im[i] += hRe * xIm + hIm * xRe;
    }
  }
}

// Makes x a unit vector; returns the norm it had.
function normalise(x: ComplexVector): number {
  let sum = 0;
  for (let i = 0; i < x.re.length; i++) sum += x.re[i] * x.re[i] + x.im[i] * x.im[i];
  const norm = Math.sqrt(sum);
  for (let i = 0; i < x.re.length; i++) {
    x.re[i] /= norm;
    x.im[i] /= norm;
  }
  return norm;
}

const jacobiSweeps = 60;

/**
 * All min(rows, cols) singular values, descending, by one-sided Jacobi
 * rotations of columns: small ones too keep their relative accuracy where the
 * columns are merely scaled.
 *
 * Source: Demmel & Veselić, SIAM J. Matrix Anal. Appl. 13(4), 1992, pp. 1204–1245.
 *
 * @throws NumericalError `numerics.not-finite`.
 */
export function singularValues(h: ComplexMatrix): Float64Array {
  const what = "A matrix whose singular values are wanted";
  const most = Math.max(requireFiniteMaximum(h.re, what), requireFiniteMaximum(h.im, what));
  const scale = powerOfTwoAbove(most);
  const x = scaled(h.cols > h.rows ? adjoint(h) : h, scale);
  for (let sweep = 0; sweep < jacobiSweeps; sweep++) {
    let turned = false;
    for (let q = 1; q < x.cols; q++) {
      for (let p = 0; p < q; p++) if (orthogonalisePair(x, p, q)) turned = true;
    }
    if (!turned) break;
  }
  const values = new Float64Array(x.cols);
  for (let j = 0; j < x.cols; j++) {
    let sum = 0;
    for (let i = j * x.rows; i < (j + 1) * x.rows; i++) sum += x.re[i] * x.re[i] + x.im[i] * x.im[i];
    values[j] = Math.sqrt(sum) * scale;
  }
  return values.sort().reverse();
}

/** Rotates columns p and q of x to be orthogonal; false if they were already to working accuracy. */
function orthogonalisePair(x: ComplexMatrix, p: number, q: number): boolean {
  const { rows, re, im } = x;
  const pAt = p * rows;
  const qAt = q * rows;
  let alpha = 0;
  let beta = 0;
  let gRe = 0;
  let gIm = 0;
  for (let i = 0; i < rows; i++) {
    const aRe = re[pAt + i];
    const aIm = im[pAt + i];
    const bRe = re[qAt + i];
    const bIm = im[qAt + i];
    alpha += aRe * aRe + aIm * aIm;
    beta += bRe * bRe + bIm * bIm;
    gRe += aRe * bRe + aIm * bIm;
    gIm += aRe * bIm - aIm * bRe;
  }
  const gamma = Math.hypot(gRe, gIm);
  if (gamma <= 2 * Number.EPSILON * Math.sqrt(alpha) * Math.sqrt(beta) || gamma < Number.MIN_VALUE * 2 ** 60)
    return false;
  const zeta = (beta - alpha) / (2 * gamma);
  const tangent = (zeta < 0 ? -1 : 1) / (Math.abs(zeta) + Math.hypot(1, zeta));
  const c = 1 / Math.hypot(1, tangent);
  const s = c * tangent;
  // Column q is first turned by the conjugate phase of pᴴq, which makes the pair's product real.
  const phaseRe = gRe / gamma;
  const phaseIm = -gIm / gamma;
  for (let i = 0; i < rows; i++) {
    const aRe = re[pAt + i];
    const aIm = im[pAt + i];
    const bRe = re[qAt + i] * phaseRe - im[qAt + i] * phaseIm;
    const bIm = re[qAt + i] * phaseIm + im[qAt + i] * phaseRe;
    re[pAt + i] = c * aRe - s * bRe;
    im[pAt + i] = c * aIm - s * bIm;
    re[qAt + i] = s * aRe + c * bRe;
    im[qAt + i] = s * aIm + c * bIm;
  }
  return true;
}
