/** Dense answers for small sparse matrices, in units that make their entries alike, and residuals without rounding. */

import { type ComplexDenseLu, factorDenseComplex } from "../../src/numerics/dense/complex-lu.js";
import { type ComplexMatrix, complexZeros } from "../../src/numerics/dense/matrix.js";
import type { ComplexValues, SparsePattern } from "../../src/numerics/sparse/sparse-matrix.js";

/** C = E A E, E of powers of two, so that C is A without rounding. */
export interface DenseReference {
  readonly order: number;
  readonly scale: Float64Array;
  readonly c: ComplexMatrix;
  readonly lu: ComplexDenseLu;
  /** ‖C‖∞ */
  readonly norm: number;
  /** ‖C‖∞ ‖C⁻¹‖∞ */
  readonly condition: number;
  /** |δ ln det| ≤ ε × this when every entry of C changes by at most ε ‖C‖∞. */
  readonly determinantSensitivity: number;
}

export function denseReference(pattern: SparsePattern, values: ComplexValues): DenseReference {
  const a = denseOf(pattern, values);
  const scale = equilibration(a);
  const n = a.rows;
  const c = complexZeros(n, n);
  for (let p = 0; p < n * n; p++) {
    const factor = scale[p % n]! * scale[Math.floor(p / n)]!;
    c.re[p] = a.re[p]! * factor;
    c.im[p] = a.im[p]! * factor;
  }
  const lu = factorDenseComplex(c);
  const inverse = complexZeros(n, n);
  for (let i = 0; i < n; i++) inverse.re[i + i * n] = 1;
  lu.solveInPlace(inverse);
  const norm = rowNorm(c);
  let columns = 0;
  for (let p = 0; p < n * n; p++) columns += Math.hypot(inverse.re[p]!, inverse.im[p]!);
  const condition = norm > 0 ? norm * rowNorm(inverse) : Number.POSITIVE_INFINITY;
  return { order: n, scale, c, lu, norm, condition, determinantSensitivity: columns * norm };
}

export function denseOf(pattern: SparsePattern, { re, im }: ComplexValues): ComplexMatrix {
  const a = complexZeros(pattern.rows, pattern.cols);
  for (let j = 0; j < pattern.cols; j++) {
    for (let p = pattern.colStart[j]!; p < pattern.colStart[j + 1]!; p++) {
      a.re[pattern.rowIndex[p]! + j * pattern.rows] = re[p]!;
      a.im[pattern.rowIndex[p]! + j * pattern.rows] = im[p]!;
    }
  }
  return a;
}

export function adjointOf({ rows, cols, re, im }: ComplexMatrix): ComplexMatrix {
  const out = complexZeros(cols, rows);
  for (let p = 0; p < rows * cols; p++) {
    const q = Math.floor(p / rows) + (p % rows) * cols;
    out.re[q] = re[p]!;
    out.im[q] = -im[p]!;
  }
  return out;
}

/** ‖b − A x‖ / (‖A‖ ‖x‖ + ‖b‖), infinity norms, every column; the residual summed as if in double the digits. */
export function exactBackwardError(a: ComplexMatrix, x: ComplexMatrix, b: ComplexMatrix): number {
  const n = a.rows;
  const norm = rowNorm(a);
  let worst = 0;
  for (let c = 0; c < b.cols; c++) {
    let residual = 0;
    let normX = 0;
    let normB = 0;
    for (let i = 0; i < n; i++) {
      const re = new TwofoldSum(b.re[i + c * n]!);
      const im = new TwofoldSum(b.im[i + c * n]!);
      for (let j = 0; j < n; j++) {
        const p = i + j * n;
        const q = j + c * n;
        re.addProduct(-a.re[p]!, x.re[q]!);
        re.addProduct(a.im[p]!, x.im[q]!);
        im.addProduct(-a.re[p]!, x.im[q]!);
        im.addProduct(-a.im[p]!, x.re[q]!);
      }
      residual = Math.max(residual, Math.hypot(re.value, im.value));
      normX = Math.max(normX, Math.hypot(x.re[i + c * n]!, x.im[i + c * n]!));
      normB = Math.max(normB, Math.hypot(b.re[i + c * n]!, b.im[i + c * n]!));
    }
    if (residual > 0) worst = Math.max(worst, residual / (norm * normX + normB));
  }
  return worst;
}

/** Diag(s) B. */
export function scaledRows(b: ComplexMatrix, factor: (i: number) => number): ComplexMatrix {
  const scaled = (part: Float64Array): Float64Array => part.map((v, p) => v * factor(p % b.rows));
  return { ...b, re: scaled(b.re), im: scaled(b.im) };
}

export function rowNorm(a: ComplexMatrix): number {
  const sums = new Float64Array(a.rows);
  for (let p = 0; p < a.re.length; p++) sums[p % a.rows]! += Math.hypot(a.re[p]!, a.im[p]!);
  return Math.max(0, ...sums);
}

/** Powers of two that bring the largest entry of every row and column near 1 (Ruiz 2001). */
function equilibration({ rows: n, re, im }: ComplexMatrix): Float64Array {
  const scale = new Float64Array(n).fill(1);
  for (let sweep = 0; sweep < 8; sweep++) {
    const most = new Float64Array(n);
    for (let p = 0; p < n * n; p++) {
      const i = p % n;
      const j = Math.floor(p / n);
      const size = Math.hypot(re[p]!, im[p]!) * scale[i]! * scale[j]!;
      most[i] = Math.max(most[i]!, size);
      most[j] = Math.max(most[j]!, size);
    }
    for (let i = 0; i < n; i++) if (most[i]! > 0) scale[i]! /= Math.sqrt(most[i]!);
  }
  return scale.map((s) => 2 ** Math.round(Math.log2(s)));
}

/** A sum of products with the rounding errors carried along (Ogita, Rump & Oishi, SIAM J. Sci. Comput. 26, 2005). */
class TwofoldSum {
  private sum: number;
  private rest = 0;

  constructor(start: number) {
    this.sum = start;
  }

  get value(): number {
    return this.sum + this.rest;
  }

  addProduct(a: number, b: number): void {
    const product = a * b;
    const [aHigh, aLow] = split(a);
    const [bHigh, bLow] = split(b);
    const lost = aLow * bLow - (product - aHigh * bHigh - aLow * bHigh - aHigh * bLow);
    const sum = this.sum + product;
    const back = sum - this.sum;
    this.rest += this.sum - (sum - back) + (product - back) + lost;
    this.sum = sum;
  }
}

function split(a: number): [number, number] {
  const big = 134217729 * a;
  const high = big - (big - a);
  return [high, a - high];
}
