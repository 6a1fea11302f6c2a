/**
 * Forward and back substitution with the factors of all fronts, for a block of right-hand
 * sides at once. Row and column ids differ where pivots left the diagonal, so the forward
 * result lives at row ids and the solution at column ids (the adjoint the other way round).
 */

import type { ComplexMatrix } from "../dense/matrix.js";
import type { ComplexSolve } from "../kernels/kernel.js";
import { type Workspace, withWorkspace } from "../kernels/workspace.js";
import type { FactorStore } from "./factor-store.js";
import { columnsTogether, type EliminatedFront } from "./front-stack.js";

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

/** Columns of a factor brought into the workspace at a time. */
const PANEL = 24;

/** X ← D (L U)⁻¹ D X, or its conjugate transpose; X is n×k. */
export function solveWithFactor(
  factor: ComplexFactor,
  scale: Float64Array,
  x: ComplexMatrix,
  adjoint: boolean,
): void {
  const most = columnsTogether(factor.order);
  for (let first = 0; first < x.cols; first += most) {
    const cols = Math.min(most, x.cols - first);
    withWorkspace((workspace) => {
      const substitution = new Substitution(factor, cols, workspace);
      substitution.load(x, first, scale);
      if (adjoint) substitution.solveAdjoint();
      else substitution.solve();
      substitution.store(x, first, scale);
    });
  }
}

class Substitution {
  private readonly factor: ComplexFactor;
  private readonly workspace: Workspace;
  private readonly cols: number;
  /** Rows of the largest front: distance between the columns of the local rows. */
  private readonly stride: number;
  /**
   * Byte addresses: right-hand sides, overwritten by the result of the forward pass, and solution, n rows of
   * the real, then the imaginary parts of all columns; the gathered rows of one front (real columns, then
   * imaginary ones) and their numbers; the columns of its factor in use.
   */
  private readonly b: number;
  private readonly x: number;
  private readonly localRe: number;
  private readonly localIm: number;
  private readonly ids: number;
  private readonly panelRe: number;
  private readonly panelIm: number;

  constructor(factor: ComplexFactor, cols: number, workspace: Workspace) {
    this.factor = factor;
    this.workspace = workspace;
    this.cols = cols;
    this.stride = factor.fronts.reduce((most, { order }) => Math.max(most, order), 0);
    this.b = workspace.begin;
    this.x = this.b + 16 * factor.order * cols;
    this.localRe = this.x + 16 * factor.order * cols;
    this.localIm = this.localRe + 8 * this.stride * cols;
    this.panelRe = this.localIm + 8 * this.stride * cols;
    this.panelIm = this.panelRe + 8 * this.stride * PANEL;
    this.ids = this.panelIm + 8 * this.stride * PANEL;
    workspace.ensure(this.ids + 4 * this.stride);
  }

  /** Takes these columns in, scaled. */
  load({ rows, re, im }: ComplexMatrix, first: number, scale: Float64Array): void {
    const { cols } = this;
    const { doubles } = this.workspace;
    for (let c = 0; c < cols; c++) {
      const column = (first + c) * rows;
      for (let i = 0, p = this.b / 8 + c; i < rows; i++, p += 2 * cols) {
        doubles[p] = re[column + i] * scale[i];
        doubles[p + cols] = im[column + i] * scale[i];
      }
    }
  }

  /** Gives the solution back, scaled. */
  store({ rows, re, im }: ComplexMatrix, first: number, scale: Float64Array): void {
    const { cols } = this;
    const { doubles } = this.workspace;
    for (let c = 0; c < cols; c++) {
      const column = (first + c) * rows;
      for (let i = 0, p = this.x / 8 + c; i < rows; i++, p += 2 * cols) {
        re[column + i] = doubles[p] * scale[i];
        im[column + i] = doubles[p + cols] * scale[i];
      }
    }
  }

  solve(): void {
    const { fronts } = this.factor;
    const { b, x } = this;
    for (const front of fronts) {
      this.gather(b, front.rowIds, 0, front.order);
      this.forward(front);
      this.scatter(b, front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      const { rowIds, colIds, pivots, order } = fronts[s];
      this.gather(b, rowIds, 0, pivots);
      this.gather(x, colIds, pivots, order);
      this.backward(fronts[s]);
      this.scatter(x, pivots, colIds);
    }
  }

  solveAdjoint(): void {
    const { fronts } = this.factor;
    const { b, x } = this;
    for (const front of fronts) {
      this.gather(b, front.colIds, 0, front.order);
      this.forwardAdjoint(front);
      this.scatter(b, front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      const { rowIds, colIds, pivots, order } = fronts[s];
      this.gather(b, colIds, 0, pivots);
      this.gather(x, rowIds, pivots, order);
      this.backwardAdjoint(fronts[s]);
      this.scatter(x, pivots, rowIds);
    }
  }

  /** The local rows from `from` to `to` by their numbers, which stay in the workspace. */
  private gather(source: number, ids: Int32Array, from: number, to: number): void {
    const { kernel, integers } = this.workspace;
    const numbers = from === 0 && to === ids.length ? ids : ids.subarray(from, to);
    integers.set(numbers, this.ids / 4);
    kernel.gatherRows(this.localRe + 8 * from, this.stride, source, 2 * this.cols, this.ids, to - from);
  }

  /** The first local rows back to where they were gathered, or to these numbers. */
  private scatter(target: number, rows: number, ids?: Int32Array): void {
    const { kernel, integers } = this.workspace;
    if (ids !== undefined) integers.set(ids.subarray(0, rows), this.ids / 4);
    kernel.scatterRows(target, 2 * this.cols, this.ids, this.localRe, this.stride, rows);
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
