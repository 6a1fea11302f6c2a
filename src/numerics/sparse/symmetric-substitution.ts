/** Forward and back substitution with the LDLᵀ factors of all fronts, for a block of right-hand sides at once. */

import type { DenseMatrix } from "../dense/matrix.js";
import { type Workspace, withWorkspace } from "../kernels/workspace.js";
import type { FactorStore } from "./factor-store.js";
import { columnsTogether, type EliminatedFront } from "./front-stack.js";

/** A front whose columns of L (order×pivots) start at `at` of the chunk. */
export interface SymmetricFrontFactor extends EliminatedFront {
  readonly chunk: number;
  readonly at: number;
  /** D: at 2k the diagonal entry of pivot k, at 2k + 1 its coupling to pivot k + 1, 0 for a 1×1 pivot. */
  readonly diagonal: Float64Array;
}

export interface SymmetricFactor {
  readonly order: number;
  readonly fronts: SymmetricFrontFactor[];
  readonly store: FactorStore;
  nonzeros: number;
  perturbedPivots: number;
}

/** Columns of a factor brought into the workspace at a time. */
const PANEL = 24;

/** X ← S (L D Lᵀ)⁻¹ S X with S = diag(scale); X is n×k. */
export function solveWithSymmetricFactor(factor: SymmetricFactor, scale: Float64Array, x: DenseMatrix): void {
  const most = columnsTogether(factor.order);
  for (let first = 0; first < x.cols; first += most) {
    const cols = Math.min(most, x.cols - first);
    withWorkspace((workspace) => {
      const substitution = new Substitution(factor, cols, workspace);
      substitution.load(x, first, scale);
      substitution.solve();
      substitution.store(x, first, scale);
    });
  }
}

class Substitution {
  private readonly factor: SymmetricFactor;
  private readonly workspace: Workspace;
  private readonly cols: number;
  /** Rows of the largest front: distance between the columns of the local rows. */
  private readonly stride: number;
  /**
   * Byte addresses: right-hand sides, overwritten by the solution, row by row; the gathered rows of one front
   * and their numbers; the columns of its factor in use.
   */
  private readonly x: number;
  private readonly local: number;
  private readonly ids: number;
  private readonly panel: number;

  constructor(factor: SymmetricFactor, cols: number, workspace: Workspace) {
    this.factor = factor;
    this.workspace = workspace;
    this.cols = cols;
    this.stride = factor.fronts.reduce((most, { order }) => Math.max(most, order), 0);
    this.x = workspace.begin;
    this.local = this.x + 8 * factor.order * cols;
    this.panel = this.local + 8 * this.stride * cols;
    this.ids = this.panel + 8 * this.stride * PANEL;
    workspace.ensure(this.ids + 4 * this.stride);
  }

  /** Takes these columns in, scaled. */
  load({ rows, values }: DenseMatrix, first: number, scale: Float64Array): void {
    const { cols } = this;
    const { doubles } = this.workspace;
    for (let c = 0; c < cols; c++) {
      const column = (first + c) * rows;
      for (let i = 0, p = this.x / 8 + c; i < rows; i++, p += cols)
        doubles[p] = values[column + i] * scale[i];
    }
  }

  /** Gives the solution back, scaled. */
  store({ rows, values }: DenseMatrix, first: number, scale: Float64Array): void {
    const { cols } = this;
    const { doubles } = this.workspace;
    for (let c = 0; c < cols; c++) {
      const column = (first + c) * rows;
      for (let i = 0, p = this.x / 8 + c; i < rows; i++, p += cols)
        values[column + i] = doubles[p] * scale[i];
    }
  }

  solve(): void {
    const { fronts } = this.factor;
    for (const front of fronts) {
      this.gather(front);
      this.forward(front);
      this.divide(front);
      this.scatter(front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      this.gather(fronts[s]);
      this.backward(fronts[s]);
      this.scatter(fronts[s].pivots);
    }
  }

  private gather({ rowIds, order }: SymmetricFrontFactor): void {
    const { kernel, integers } = this.workspace;
    integers.set(rowIds, this.ids / 4);
    kernel.gatherRows(this.local, this.stride, this.x, this.cols, this.ids, order);
  }

  /** The first rows back to where they were gathered. */
  private scatter(rows: number): void {
    this.workspace.kernel.scatterRows(this.x, this.cols, this.ids, this.local, this.stride, rows);
  }

  /** w₁ ← L₁₁⁻¹ w₁, w₂ ← w₂ − L₂₁ w₁. */
  private forward(front: SymmetricFrontFactor): void {
    const { order, pivots } = front;
    const { panel, stride, cols } = this;
    const { kernel } = this.workspace;
    for (let k = 0; k < pivots; k += PANEL) {
      const size = Math.min(PANEL, pivots - k);
      const next = k + size;
      const rows = this.rows(k);
      this.fetch(front, k, size);
      kernel.solveRealUnitLower(panel + 8 * k, order, rows, stride, cols, size);
      if (next === order) continue;
      const below = panel + 8 * next;
      kernel.subtractReal(this.rows(next), stride, below, order, rows, stride, order - next, cols, size, 0);
    }
  }

  /** w₁ ← D⁻¹ w₁. */
  private divide({ pivots, diagonal }: SymmetricFrontFactor): void {
    const { stride } = this;
    const { doubles } = this.workspace;
    const local = this.local / 8;
    for (let k = 0; k < pivots; k++) {
      const a = diagonal[2 * k];
      const b = diagonal[2 * k + 1];
      if (b === 0) {
        for (let c = 0, p = local + k; c < this.cols; c++, p += stride) doubles[p] /= a;
        continue;
      }
      const d = diagonal[2 * k + 2];
      const determinant = a * d - b * b;
      for (let c = 0, p = local + k; c < this.cols; c++, p += stride) {
        const y = doubles[p];
        const z = doubles[p + 1];
        doubles[p] = (d * y - b * z) / determinant;
        doubles[p + 1] = (a * z - b * y) / determinant;
      }
      k++;
    }
  }

  /** w₁ ← L₁₁⁻ᵀ (w₁ − L₂₁ᵀ w₂). */
  private backward(front: SymmetricFrontFactor): void {
    const { order, pivots } = front;
    const { panel, stride, cols } = this;
    const { kernel } = this.workspace;
    for (let k = pivots - 1 - ((pivots - 1) % PANEL); k >= 0; k -= PANEL) {
      const size = Math.min(PANEL, pivots - k);
      const next = k + size;
      const rows = this.rows(k);
      this.fetch(front, k, size);
      if (next < order) {
        const below = panel + 8 * next;
        kernel.subtractReal(rows, stride, below, order, this.rows(next), stride, size, cols, order - next, 1);
      }
      kernel.solveRealUnitLowerTransposed(panel + 8 * k, order, rows, stride, cols, size);
    }
  }

  private rows(from: number): number {
    return this.local + 8 * from;
  }

  /** Brings whole columns of a factor into the panel. */
  private fetch({ at, chunk, order }: SymmetricFrontFactor, first: number, columns: number): void {
    const begin = at + first * order;
    const entries = this.factor.store.array(chunk).subarray(begin, begin + columns * order);
    this.workspace.doubles.set(entries, this.panel / 8);
  }
}
