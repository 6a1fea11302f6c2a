import { addProductInto, addTransposedProductInto } from "../numerics/dense/block-kernels.js";
import { column, type DenseMatrix, zeros } from "../numerics/dense/matrix.js";
import { wholeBlock } from "../numerics/dense/products.js";
import { multiplyColumns } from "../numerics/sparse/real-sparse-products.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";

/** Vectors projected together. */
const together = 8;

/**
 * A growing real basis V with VᵀEV = I, E symmetric positive definite. E is an energy
 * (K + σM at one sample), so displacements and rotations weigh alike and "small" has a meaning.
 */
export class Basis {
  readonly rows: number;
  readonly #energy: SparseMatrix;
  #columns: Float64Array;
  #count = 0;

  constructor(energy: SparseMatrix) {
    this.rows = energy.rows;
    this.#energy = energy;
    this.#columns = new Float64Array(16 * energy.rows);
  }

  get cols(): number {
    return this.#count;
  }

  /** V, a view that stays valid until the next `append`. */
  get matrix(): DenseMatrix {
    const { rows, cols } = this;
    return { rows, cols, values: this.#columns.subarray(0, rows * cols) };
  }

  /**
   * Orthonormalises each vector against V and appends it, unless less than `dropBelow` of its
   * energy norm is new (0…1, dimensionless). Returns how many were appended.
   */
  append(vectors: Iterable<Float64Array>, dropBelow: number): number {
    const before = this.#count;
    let waiting: Float64Array[] = [];
    for (const vector of vectors) {
      if (this.#count === this.rows) break;
      waiting.push(vector);
      if (waiting.length === together) {
        this.#appendBlock(waiting, dropBelow);
        waiting = [];
      }
    }
    this.#appendBlock(waiting, dropBelow);
    return this.#count - before;
  }

  #appendBlock(vectors: readonly Float64Array[], dropBelow: number): void {
    const known = this.#count;
    const w = zeros(this.rows, vectors.length);
    vectors.forEach((vector, j) => {
      column(w, j).set(vector);
    });
    const energyW = multiplyColumns(this.#energy, w);
    const original = vectors.map((_, j) => energyNorm(column(w, j), column(energyW, j)));
    // Two passes are enough for orthogonality to rounding (Giraud, Langou, Rozložník 2005).
    this.#removeComponents(w, energyW, 0, known);
    this.#removeComponents(w, multiplyColumns(this.#energy, w), 0, known);
    const rest = multiplyColumns(this.#energy, w);
    for (let j = 0; j < w.cols; j++) {
      if (!(original[j] > 0) || !Number.isFinite(original[j])) continue;
      this.#acceptColumn(column(w, j), column(rest, j), known, dropBelow * original[j]);
    }
  }

  /** Appends w, orthogonal to the first `known` columns, made so to the later ones too, if it stays above `floor`. */
  #acceptColumn(w: Float64Array, energyW: Float64Array, known: number, floor: number): void {
    if (this.#count === this.rows) return;
    const x = { rows: this.rows, cols: 1, values: w };
    let energyX = { rows: this.rows, cols: 1, values: energyW };
    for (let first = known; ; first = 0) {
      const before = energyNorm(w, energyX.values);
      const removed = norm2(this.#removeComponents(x, energyX, first, this.#count));
      const left = Math.sqrt(Math.max(0, before * before - removed * removed));
      if (before <= floor) return;
      // Where much went, rounding errors along all columns have grown with what is left: once more then.
      if (left <= 0.5 * before) {
        energyX = multiplyColumns(this.#energy, x);
        continue;
      }
      if (left > floor) {
        for (let i = 0; i < w.length; i++) w[i] /= left;
        this.#store(w);
      }
      return;
    }
  }

  /** W ← W − V VᵀEW over columns `first` … `end` − 1 of V; returns the coefficients. */
  #removeComponents(w: DenseMatrix, energyW: DenseMatrix, first: number, end: number): Float64Array {
    const n = this.rows;
    const c = zeros(end - first, w.cols);
    const v = { values: this.#columns, at: first * n, stride: n };
    addTransposedProductInto(wholeBlock(c), 1, v, wholeBlock(energyW), c.rows, w.cols, n);
    addProductInto(wholeBlock(w), -1, v, wholeBlock(c), n, w.cols, c.rows);
    return c.values;
  }

  #store(w: Float64Array): void {
    const n = this.rows;
    if ((this.#count + 1) * n > this.#columns.length) {
      const grown = new Float64Array(Math.min(2 * this.#columns.length, n * n));
      grown.set(this.#columns);
      this.#columns = grown;
    }
    this.#columns.set(w, this.#count * n);
    this.#count++;
  }
}

/** √(wᵀEw). */
function energyNorm(w: Float64Array, energyW: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < w.length; i++) sum += w[i] * energyW[i];
  return Math.sqrt(Math.max(0, sum));
}

function norm2(x: Float64Array): number {
  let sum = 0;
  for (const value of x) sum += value * value;
  return Math.sqrt(sum);
}
