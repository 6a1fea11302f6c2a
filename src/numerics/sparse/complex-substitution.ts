/**
 * Forward and back substitution with the factors of all fronts, for a block of right-hand
 * sides at once. Row and column ids differ where pivots left the diagonal, so the forward
 * result lives at row ids and the solution at column ids (the adjoint the other way round).
 */

import type { ComplexMatrix } from "../dense/matrix.js";
import type { ComplexSolve } from "../kernels/kernel.js";
import { type Workspace, withWorkspace } from "../kernels/workspace.js";
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
}

/** Right-hand sides taken through the tree together. */
const BLOCK_COLUMNS = 48;
/** Columns of a factor brought into the workspace at a time. */
const PANEL = 24;

/** X ← D (L U)⁻¹ D X, or its conjugate transpose; X is n×k. */
export function solveWithFactor(
  factor: ComplexFactor,
  scale: Float64Array,
  x: ComplexMatrix,
  adjoint: boolean,
): void {
  const n = factor.order;
  for (let first = 0; first < x.cols; first += BLOCK_COLUMNS) {
    const cols = Math.min(BLOCK_COLUMNS, x.cols - first);
    const re = x.re.subarray(first * n, (first + cols) * n);
    const im = x.im.subarray(first * n, (first + cols) * n);
    scaleRows(scale, re, im, cols);
    withWorkspace((workspace) => {
      const substitution = new Substitution(factor, { rows: n, cols, re, im }, workspace);
      if (adjoint) substitution.solveAdjoint();
      else substitution.solve();
    });
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
  private readonly workspace: Workspace;
  /** Right-hand sides, overwritten by the result of the forward pass, then by the solution. */
  private readonly b: ComplexMatrix;
  private readonly x: ComplexMatrix;
  private readonly cols: number;
  /** Rows of the largest front: distance between the columns of the local rows. */
  private readonly stride: number;
  /** Byte addresses of the gathered rows of one front, and of the columns of its factor in use. */
  private readonly localRe: number;
  private readonly localIm: number;
  private readonly panelRe: number;
  private readonly panelIm: number;

  constructor(factor: ComplexFactor, b: ComplexMatrix, workspace: Workspace) {
    const { rows, cols } = b;
    this.factor = factor;
    this.workspace = workspace;
    this.b = b;
    this.cols = cols;
    this.x = { rows, cols, re: new Float64Array(rows * cols), im: new Float64Array(rows * cols) };
    this.stride = factor.fronts.reduce((most, { order }) => Math.max(most, order), 0);
    this.localRe = workspace.begin;
    this.localIm = this.localRe + 8 * this.stride * cols;
    this.panelRe = this.localIm + 8 * this.stride * cols;
    this.panelIm = this.panelRe + 8 * this.stride * PANEL;
    workspace.ensure(this.panelIm + 8 * this.stride * PANEL);
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

  private gather(source: ComplexMatrix, ids: Int32Array, from: number, to: number): void {
    const { doubles } = this.workspace;
    for (let c = 0; c < this.cols; c++) {
      const column = c * source.rows;
      const toRe = this.localRe / 8 + c * this.stride;
      const toIm = this.localIm / 8 + c * this.stride;
      for (let i = from; i < to; i++) {
        doubles[toRe + i] = source.re[column + ids[i]];
        doubles[toIm + i] = source.im[column + ids[i]];
      }
    }
  }

  private scatter(target: ComplexMatrix, ids: Int32Array, from: number, to: number): void {
    const { doubles } = this.workspace;
    for (let c = 0; c < this.cols; c++) {
      const column = c * target.rows;
      const fromRe = this.localRe / 8 + c * this.stride;
      const fromIm = this.localIm / 8 + c * this.stride;
      for (let i = from; i < to; i++) {
        target.re[column + ids[i]] = doubles[fromRe + i];
        target.im[column + ids[i]] = doubles[fromIm + i];
      }
    }
  }

  /** w₁ ← L₁₁⁻¹ w₁, w₂ ← w₂ − L₂₁ w₁. */
  private forward(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    const { kernel } = this.workspace;
    for (let k = 0; k < pivots; k += PANEL) {
      const size = Math.min(PANEL, pivots - k);
      this.fetch(front, k * order, size * order);
      this.triangle(kernel.solveComplexUnitLower, k, order, k, size);
      this.subtract(k + size, k + size, order, k, order - k - size, size, false);
    }
  }

  /** w₁ ← U₁₁⁻¹ (w₁ − U₁₂ w₂). */
  private backward(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    const { kernel } = this.workspace;
    this.forUpper(front, (j, columns) => this.subtract(0, 0, pivots, pivots + j, pivots, columns, false));
    for (let k = lastPanel(pivots); k >= 0; k -= PANEL) {
      const size = Math.min(PANEL, pivots - k);
      this.fetch(front, k * order, size * order);
      this.triangle(kernel.solveComplexUpper, k, order, k, size);
      this.subtract(0, 0, order, k, k, size, false);
    }
  }

  /** w₁ ← U₁₁⁻ᴴ w₁, w₂ ← w₂ − U₁₂ᴴ w₁. */
  private forwardAdjoint(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    const { kernel } = this.workspace;
    for (let k = 0; k < pivots; k += PANEL) {
      const size = Math.min(PANEL, pivots - k);
      this.fetch(front, k * order, size * order);
      this.subtract(k, 0, order, 0, size, k, true);
      this.triangle(kernel.solveComplexUpperAdjoint, k, order, k, size);
    }
    this.forUpper(front, (j, columns) => this.subtract(pivots + j, 0, pivots, 0, columns, pivots, true));
  }

  /** w₁ ← L₁₁⁻ᴴ (w₁ − L₂₁ᴴ w₂). */
  private backwardAdjoint(front: ComplexFrontFactor): void {
    const { order, pivots } = front;
    const { kernel } = this.workspace;
    for (let k = lastPanel(pivots); k >= 0; k -= PANEL) {
      const size = Math.min(PANEL, pivots - k);
      this.fetch(front, k * order, size * order);
      this.subtract(k, k + size, order, k + size, size, order - k - size, true);
      this.triangle(kernel.solveComplexUnitLowerAdjoint, k, order, k, size);
    }
  }

  /** Visits U₁₂ (pivots×rest), as many columns as fit the panel at a time. */
  private forUpper(front: ComplexFrontFactor, visit: (first: number, columns: number) => void): void {
    const { order, pivots } = front;
    if (pivots === 0) return;
    const most = Math.max(1, Math.floor((this.stride * PANEL) / pivots));
    for (let j = 0; j < order - pivots; j += most) {
      const columns = Math.min(most, order - pivots - j);
      this.fetch(front, pivots * (order + j), pivots * columns);
      visit(j, columns);
    }
  }

  /** Brings these entries of a factor into the panel. */
  private fetch(front: ComplexFrontFactor, offset: number, entries: number): void {
    const { doubles } = this.workspace;
    const at = front.at + offset;
    doubles.set(this.factor.re.array(front.chunk).subarray(at, at + entries), this.panelRe / 8);
    doubles.set(this.factor.im.array(front.chunk).subarray(at, at + entries), this.panelIm / 8);
  }

  /** Solves for the local rows from `row` on with the triangle that starts in this row of the panel. */
  private triangle(
    solve: ComplexSolve,
    panelRow: number,
    panelStride: number,
    row: number,
    size: number,
  ): void {
    const { panelRe, panelIm, localRe, localIm, stride } = this;
    const t = 8 * panelRow;
    const x = 8 * row;
    solve(panelRe + t, panelIm + t, panelStride, localRe + x, localIm + x, stride, this.cols, size);
  }

  /** Local rows from `to` less op(panel) times local rows from `from`; op(panel) is m×k. */
  private subtract(
    to: number,
    panelRow: number,
    panelStride: number,
    from: number,
    m: number,
    k: number,
    adjoint: boolean,
  ): void {
    if (m === 0 || k === 0) return;
    const { panelRe, panelIm, localRe, localIm, stride } = this;
    const y = 8 * to;
    const a = 8 * panelRow;
    const x = 8 * from;
    this.workspace.kernel.subtractComplex(
      localRe + y,
      localIm + y,
      stride,
      panelRe + a,
      panelIm + a,
      panelStride,
      localRe + x,
      localIm + x,
      stride,
      m,
      this.cols,
      k,
      adjoint ? 1 : 0,
    );
  }
}

/** First column of the last panel, negative without any. */
function lastPanel(pivots: number): number {
  return pivots - 1 - ((pivots - 1) % PANEL);
}
