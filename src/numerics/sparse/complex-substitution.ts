/**
 * Forward and back substitution with the factors of all fronts, for a block of right-hand
 * sides at once. Row and column ids differ where pivots left the diagonal, so the forward
 * result lives at row ids and the solution at column ids (the adjoint the other way round).
 */

import type { ComplexMatrix } from "../dense/matrix.js";
import {
  type ComplexBlock,
  solveUnitLowerAdjointInPlace,
  solveUnitLowerInPlace,
  solveUpperAdjointInPlace,
  solveUpperInPlace,
  subtractProductInto,
  subtractThinAdjointProductInto,
  subtractThinProductInto,
} from "./complex-kernels.js";
import type { FactorStore } from "./factor-store.js";
import type { EliminatedFront } from "./front-stack.js";

/** A front whose columns of L and U₁₁ (order×pivots) and U₁₂ (pivots×rest) start at `at` of the chunk. */
export interface ComplexFrontFactor extends EliminatedFront {
  readonly chunk: number;
  readonly at: number;
}

export interface ComplexFactor {
  readonly order: number;
  readonly fronts: ComplexFrontFactor[];
  readonly re: FactorStore;
  readonly im: FactorStore;
  nonzeros: number;
  perturbedPivots: number;
}

/** Right-hand sides taken through the tree together. */
const BLOCK_COLUMNS = 48;
/** From this many right-hand sides on, packing pays. */
const PACKED_FROM = 4;
/** Triangles are solved in blocks of this size. */
const TRIANGLE = 24;

/** X ← D (L U)⁻¹ D X, or its conjugate transpose; X is n×k. */
export function solveWithFactor(
  factor: ComplexFactor,
  scale: Float64Array,
  x: ComplexMatrix,
  adjoint: boolean,
): void {
  const n = factor.order;
  let largest = 0;
  for (const front of factor.fronts) largest = Math.max(largest, front.order);
  for (let first = 0; first < x.cols; first += BLOCK_COLUMNS) {
    const cols = Math.min(BLOCK_COLUMNS, x.cols - first);
    const re = x.re.subarray(first * n, (first + cols) * n);
    const im = x.im.subarray(first * n, (first + cols) * n);
    scaleRows(scale, re, im, cols);
    const substitution = new Substitution(factor, largest, { re, im, at: 0, stride: n }, cols);
    if (adjoint) substitution.solveAdjoint();
    else substitution.solve();
    scaleRows(scale, re, im, cols);
  }
}

function scaleRows(scale: Float64Array, re: Float64Array, im: Float64Array, cols: number): void {
  for (let c = 0, p = 0; c < cols; c++) {
    for (let i = 0; i < scale.length; i++, p++) {
      re[p] *= scale[i];
      im[p] *= scale[i];
    }
  }
}

class Substitution {
  private readonly factor: ComplexFactor;
  /** Right-hand sides, overwritten by the result of the forward pass. */
  private readonly b: ComplexBlock;
  private readonly x: ComplexBlock;
  private readonly cols: number;
  /** The rows of one front, gathered. */
  private readonly local: ComplexBlock;

  constructor(factor: ComplexFactor, largest: number, b: ComplexBlock, cols: number) {
    this.factor = factor;
    this.b = b;
    this.cols = cols;
    const n = factor.order;
    this.x = { re: new Float64Array(n * cols), im: new Float64Array(n * cols), at: 0, stride: n };
    this.local = {
      re: new Float64Array(largest * cols),
      im: new Float64Array(largest * cols),
      at: 0,
      stride: largest,
    };
  }

  solve(): void {
    const { fronts } = this.factor;
    const { b, x } = this;
    for (const front of fronts) {
      this.gather(b, front.rowIds, 0, front.order);
      this.forward(front);
      this.scatter(b, front.rowIds, 0, front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      const { rowIds, colIds, pivots, order } = fronts[s];
      this.gather(b, rowIds, 0, pivots);
      this.gather(x, colIds, pivots, order);
      this.backward(fronts[s]);
      this.scatter(x, colIds, 0, pivots);
    }
    b.re.set(x.re);
    b.im.set(x.im);
  }

  solveAdjoint(): void {
    const { fronts } = this.factor;
    const { b, x } = this;
    for (const front of fronts) {
      this.gather(b, front.colIds, 0, front.order);
      this.forwardAdjoint(front);
      this.scatter(b, front.colIds, 0, front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      const { rowIds, colIds, pivots, order } = fronts[s];
      this.gather(b, colIds, 0, pivots);
      this.gather(x, rowIds, pivots, order);
      this.backwardAdjoint(fronts[s]);
      this.scatter(x, rowIds, 0, pivots);
    }
    b.re.set(x.re);
    b.im.set(x.im);
  }

  private gather(source: ComplexBlock, ids: Int32Array, from: number, to: number): void {
    const { re, im, stride } = this.local;
    for (let c = 0; c < this.cols; c++) {
      for (let i = from; i < to; i++) {
        re[i + c * stride] = source.re[ids[i] + c * source.stride];
        im[i + c * stride] = source.im[ids[i] + c * source.stride];
      }
    }
  }

  private scatter(target: ComplexBlock, ids: Int32Array, from: number, to: number): void {
    const { re, im, stride } = this.local;
    for (let c = 0; c < this.cols; c++) {
      for (let i = from; i < to; i++) {
        target.re[ids[i] + c * target.stride] = re[i + c * stride];
        target.im[ids[i] + c * target.stride] = im[i + c * stride];
      }
    }
  }

  /** w₁ ← L₁₁⁻¹ w₁, w₂ ← w₂ − L₂₁ w₁. */
  private forward(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    for (let k = 0; k < pivots; k += TRIANGLE) {
      const size = Math.min(TRIANGLE, pivots - k);
      solveUnitLowerInPlace(this.lower(front, k, k), this.rows(k), this.cols, size);
      const next = k + size;
      this.subtract(this.rows(next), this.lower(front, next, k), this.rows(k), order - next, size);
    }
  }

  /** w₁ ← U₁₁⁻¹ (w₁ − U₁₂ w₂). */
  private backward(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    this.subtract(this.rows(0), this.upper(front), this.rows(pivots), pivots, order - pivots);
    for (let end = pivots; end > 0; end = end - 1 - ((end - 1) % TRIANGLE)) {
      const k = end - 1 - ((end - 1) % TRIANGLE);
      solveUpperInPlace(this.lower(front, k, k), this.rows(k), this.cols, end - k);
      this.subtract(this.rows(0), this.lower(front, 0, k), this.rows(k), k, end - k);
    }
  }

  /** w₁ ← U₁₁⁻ᴴ w₁, w₂ ← w₂ − U₁₂ᴴ w₁. */
  private forwardAdjoint(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    for (let k = 0; k < pivots; k += TRIANGLE) {
      const size = Math.min(TRIANGLE, pivots - k);
      this.subtractAdjoint(this.rows(k), this.lower(front, 0, k), this.rows(0), size, k);
      solveUpperAdjointInPlace(this.lower(front, k, k), this.rows(k), this.cols, size);
    }
    this.subtractAdjoint(this.rows(pivots), this.upper(front), this.rows(0), order - pivots, pivots);
  }

  /** w₁ ← L₁₁⁻ᴴ (w₁ − L₂₁ᴴ w₂). */
  private backwardAdjoint(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    for (let end = pivots; end > 0; end = end - 1 - ((end - 1) % TRIANGLE)) {
      const k = end - 1 - ((end - 1) % TRIANGLE);
      this.subtractAdjoint(this.rows(k), this.lower(front, end, k), this.rows(end), end - k, order - end);
      solveUnitLowerAdjointInPlace(this.lower(front, k, k), this.rows(k), this.cols, end - k);
    }
  }

  private lower(front: ComplexFrontFactor, row: number, col: number): ComplexBlock {
    return this.block(front, row + col * front.order, front.order);
  }

  private upper(front: ComplexFrontFactor): ComplexBlock {
    return this.block(front, front.pivots * front.order, front.pivots);
  }

  private block(front: ComplexFrontFactor, offset: number, stride: number): ComplexBlock {
    const { re, im } = this.factor;
    return { re: re.array(front.chunk), im: im.array(front.chunk), at: front.at + offset, stride };
  }

  private rows(from: number): ComplexBlock {
    return { re: this.local.re, im: this.local.im, at: from, stride: this.local.stride };
  }

  private subtract(y: ComplexBlock, a: ComplexBlock, x: ComplexBlock, m: number, k: number): void {
    if (this.cols < PACKED_FROM) subtractThinProductInto(y, a, x, m, this.cols, k);
    else subtractProductInto(y, a, x, m, this.cols, k, false);
  }

  private subtractAdjoint(y: ComplexBlock, a: ComplexBlock, x: ComplexBlock, m: number, k: number): void {
    if (this.cols < PACKED_FROM) subtractThinAdjointProductInto(y, a, x, m, this.cols, k);
    else subtractProductInto(y, a, x, m, this.cols, k, true);
  }
}
