/** Forward and back substitution with the LDLᵀ factors of all fronts, for a block of right-hand sides at once. */

import type { DenseMatrix } from "../dense/matrix.js";
import type { FactorStore } from "./factor-store.js";
import type { EliminatedFront } from "./front-stack.js";
import {
  type RealBlock,
  solveRealUnitLowerInPlace,
  solveRealUnitLowerTransposedInPlace,
  subtractRealProductInto,
  subtractThinRealProductInto,
  subtractThinRealTransposedProductInto,
} from "./real-kernels.js";

/** A front whose columns of L (order×pivots) start at `at` of the chunk. */
export interface SymmetricFrontFactor extends EliminatedFront {
  readonly chunk: number;
  readonly at: number;
  /** D, as in `SymmetricElimination`. */
  readonly diagonal: Float64Array;
}

export interface SymmetricFactor {
  readonly order: number;
  readonly fronts: SymmetricFrontFactor[];
  readonly store: FactorStore;
  nonzeros: number;
  perturbedPivots: number;
}

/** Right-hand sides taken through the tree together. */
const BLOCK_COLUMNS = 64;
/** From this many right-hand sides on, packing pays. */
const PACKED_FROM = 6;
/** Triangles are solved in blocks of this size. */
const TRIANGLE = 24;

/** X ← S (L D Lᵀ)⁻¹ S X with S = diag(scale); X is n×k. */
export function solveWithSymmetricFactor(factor: SymmetricFactor, scale: Float64Array, x: DenseMatrix): void {
  const n = factor.order;
  let largest = 0;
  for (const front of factor.fronts) largest = Math.max(largest, front.order);
  for (let first = 0; first < x.cols; first += BLOCK_COLUMNS) {
    const cols = Math.min(BLOCK_COLUMNS, x.cols - first);
    const values = x.values.subarray(first * n, (first + cols) * n);
    scaleRows(scale, values, cols);
    new Substitution(factor, largest, values, cols).solve();
    scaleRows(scale, values, cols);
  }
}

function scaleRows(scale: Float64Array, values: Float64Array, cols: number): void {
  for (let c = 0, p = 0; c < cols; c++) for (let i = 0; i < scale.length; i++, p++) values[p] *= scale[i];
}

class Substitution {
  private readonly factor: SymmetricFactor;
  private readonly x: Float64Array;
  private readonly cols: number;
  /** The rows of one front, gathered. */
  private readonly local: Float64Array;
  private readonly stride: number;

  constructor(factor: SymmetricFactor, largest: number, x: Float64Array, cols: number) {
    this.factor = factor;
    this.x = x;
    this.cols = cols;
    this.stride = largest;
    this.local = new Float64Array(largest * cols);
  }

  solve(): void {
    const { fronts } = this.factor;
    for (const front of fronts) {
      this.gather(front);
      this.forward(front);
      this.divide(front);
      this.scatter(front, front.order);
    }
    for (let s = fronts.length - 1; s >= 0; s--) {
      this.gather(fronts[s]);
      this.backward(fronts[s]);
      this.scatter(fronts[s], fronts[s].pivots);
    }
  }

  private gather({ rowIds, order }: SymmetricFrontFactor): void {
    const { x, local, stride } = this;
    for (let c = 0; c < this.cols; c++) {
      const from = c * this.factor.order;
      const to = c * stride;
      for (let i = 0; i < order; i++) local[to + i] = x[from + rowIds[i]];
    }
  }

  private scatter({ rowIds }: SymmetricFrontFactor, rows: number): void {
    const { x, local, stride } = this;
    for (let c = 0; c < this.cols; c++) {
      const to = c * this.factor.order;
      const from = c * stride;
      for (let i = 0; i < rows; i++) x[to + rowIds[i]] = local[from + i];
    }
  }

  /** w₁ ← L₁₁⁻¹ w₁, w₂ ← w₂ − L₂₁ w₁. */
  private forward(front: SymmetricFrontFactor): void {
    const { order, pivots } = front;
    for (let k = 0; k < pivots; k += TRIANGLE) {
      const size = Math.min(TRIANGLE, pivots - k);
      solveRealUnitLowerInPlace(this.lower(front, k, k), this.rows(k), this.cols, size);
      const next = k + size;
      const below = this.lower(front, next, k);
      if (this.cols < PACKED_FROM) {
        subtractThinRealProductInto(this.rows(next), below, this.rows(k), order - next, this.cols, size);
      } else {
        subtractRealProductInto(this.rows(next), below, this.rows(k), order - next, this.cols, size, false);
      }
    }
  }

  /** w₁ ← D⁻¹ w₁. */
  private divide({ pivots, diagonal }: SymmetricFrontFactor): void {
    const { local, stride } = this;
    for (let k = 0; k < pivots; k++) {
      const a = diagonal[2 * k];
      const b = diagonal[2 * k + 1];
      if (b === 0) {
        for (let c = 0, p = k; c < this.cols; c++, p += stride) local[p] /= a;
        continue;
      }
      const d = diagonal[2 * k + 2];
      const determinant = a * d - b * b;
      for (let c = 0, p = k; c < this.cols; c++, p += stride) {
        const y = local[p];
        const z = local[p + 1];
        local[p] = (d * y - b * z) / determinant;
        local[p + 1] = (a * z - b * y) / determinant;
      }
      k++;
    }
  }

  /** w₁ ← L₁₁⁻ᵀ (w₁ − L₂₁ᵀ w₂). */
  private backward(front: SymmetricFrontFactor): void {
    const { order, pivots } = front;
    for (let end = pivots; end > 0; end = end - 1 - ((end - 1) % TRIANGLE)) {
      const k = end - 1 - ((end - 1) % TRIANGLE);
      const below = this.lower(front, end, k);
      if (this.cols < PACKED_FROM) {
        subtractThinRealTransposedProductInto(
          this.rows(k),
          below,
          this.rows(end),
          end - k,
          this.cols,
          order - end,
        );
      } else {
        subtractRealProductInto(this.rows(k), below, this.rows(end), end - k, this.cols, order - end, true);
      }
      solveRealUnitLowerTransposedInPlace(this.lower(front, k, k), this.rows(k), this.cols, end - k);
    }
  }

  private lower(front: SymmetricFrontFactor, row: number, col: number): RealBlock {
    const at = front.at + row + col * front.order;
    return { values: this.factor.store.array(front.chunk), at, stride: front.order };
  }

  private rows(from: number): RealBlock {
    return { values: this.local, at: from, stride: this.stride };
  }
}
