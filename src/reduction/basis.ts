import type { DenseMatrix } from "../numerics/dense/matrix.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { multiplyAddInto } from "../numerics/sparse/sparse-matrix.js";

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
    for (const vector of vectors) {
      if (this.#count === this.rows) break;
      this.#appendOne(vector, dropBelow);
    }
    return this.#count - before;
  }

  #appendOne(vector: Float64Array, dropBelow: number): void {
    const w = vector.slice();
    const original = this.#energyNorm(w);
    if (!(original > 0) || !Number.isFinite(original)) return;
    // Two passes are enough for orthogonality to rounding (Giraud, Langou, Rozložník 2005).
    this.#removeComponents(w);
    this.#removeComponents(w);
    const left = this.#energyNorm(w);
    if (left <= dropBelow * original) return;
    for (let i = 0; i < w.length; i++) w[i] /= left;
    this.#store(w);
  }

  #removeComponents(w: Float64Array): void {
    const n = this.rows;
    const ew = new Float64Array(n);
    multiplyAddInto(ew, 1, this.#energy, w);
    const v = this.#columns;
    for (let j = 0; j < this.#count; j++) {
      const from = j * n;
      let sum = 0;
      for (let i = 0; i < n; i++) sum += v[from + i] * ew[i];
      for (let i = 0; i < n; i++) w[i] -= sum * v[from + i];
    }
  }

  #energyNorm(w: Float64Array): number {
    const ew = new Float64Array(this.rows);
    multiplyAddInto(ew, 1, this.#energy, w);
    let sum = 0;
    for (let i = 0; i < ew.length; i++) sum += w[i] * ew[i];
    return Math.sqrt(Math.max(0, sum));
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
