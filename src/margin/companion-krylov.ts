import type { Pencil, PencilFactor } from "../model/pencil.js";
import { orthogonaliseInPlace } from "../numerics/dense/complex-gram-schmidt.js";
import { norm2, normaliseInPlace } from "../numerics/dense/complex-vectors.js";
import {
  type ComplexMatrix,
  type ComplexVector,
  complexColumn,
  complexVector,
  complexZeros,
} from "../numerics/dense/matrix.js";
import { createRandom } from "../numerics/random.js";
import { asColumn } from "./eigenpair.js";

/**
 * A growing Arnoldi relation of T = (A − σE)⁻¹E, the first companion form of P shifted and inverted:
 *
 *     T V = V H + w eᵀ,   VᴴV = I,   z = [q; q̇/s₀],   1/(λ − σ) eigenvalues of T.
 *
 * One solve with P(σ) a step; its start is random.
 */
export class CompanionKrylov {
  size = 0;
  /** The space closed: its eigenvalues are all there are. */
  exhausted = false;
  /** 2n rows; the first `size` columns are V: displacements above velocities over s₀. */
  readonly basis: ComplexMatrix;
  readonly #pencil: Pencil;
  readonly #factor: PencilFactor;
  readonly #scale: number;
  readonly #capacity: number;
  readonly #h: ComplexMatrix;
  readonly #sum: ComplexVector;
  readonly #load: ComplexVector;

  /**
   * @param scale - s₀ [rad/s] that makes the two halves of z comparable.
   * @param mostSteps - Largest size.
   */
  constructor(pencil: Pencil, factor: PencilFactor, scale: number, seed: number, mostSteps: number) {
    const rows = 2 * pencil.order;
    this.#pencil = pencil;
    this.#factor = factor;
    this.#scale = scale;
    this.#capacity = Math.min(mostSteps, rows);
    this.basis = complexZeros(rows, this.#capacity + 1);
    this.#h = complexZeros(this.#capacity, this.#capacity);
    this.#sum = complexVector(pencil.order);
    this.#load = complexVector(pencil.order);
    const random = createRandom(seed);
    const start = complexVector(rows);
    for (let i = 0; i < rows; i++) start.re[i] = random.normal();
    // Pushed through the operator once: the start then has no part in the infinite eigenvalues.
    const first = complexColumn(this.basis, 0);
    this.#applyInto(first, start);
    normaliseInPlace(first);
  }

  get full(): boolean {
    return this.size === this.#capacity;
  }

  /** Takes so many steps as long as the space is neither full nor exhausted. */
  expand(steps: number): void {
    const { basis } = this;
    const end = Math.min(this.#capacity, this.size + steps);
    while (this.size < end && !this.exhausted) {
      const next = complexColumn(basis, this.size + 1);
      this.#applyInto(next, complexColumn(basis, this.size));
      const before = norm2(next);
      const coefficients = complexColumn(this.#h, this.size);
      this.size++;
      orthogonaliseInPlace(next, basis, this.size, coefficients);
      const left = normaliseInPlace(next);
      this.exhausted = left <= 1e-13 * before || this.size === basis.rows;
      if (this.size < this.#capacity) coefficients.re[this.size] = left;
    }
  }

  /** H, a copy. */
  hessenberg(): ComplexMatrix {
    const k = this.size;
    const h = this.#h;
    const out = complexZeros(k, k);
    for (let j = 0; j < k; j++) {
      out.re.set(h.re.subarray(j * h.rows, j * h.rows + k), j * k);
      out.im.set(h.im.subarray(j * h.rows, j * h.rows + k), j * k);
    }
    return out;
  }

  /** out ← T z: x = −P(σ)⁻¹(M z₂ s₀ + (C + σM) z₁), then [x; (z₁ + σx)/s₀]. */
  #applyInto(out: ComplexVector, z: ComplexVector): void {
    const { order: n, mass, velocity } = this.#pencil;
    const { sRe, sIm } = this.#factor;
    const scale = this.#scale;
    const load = this.#load;
    const { re: sumRe, im: sumIm } = this.#sum;
    const { re: loadRe, im: loadIm } = load;
    const { re: zRe, im: zIm } = z;
    for (let i = 0; i < n; i++) {
      sumRe[i] = scale * zRe[n + i] + sRe * zRe[i] - sIm * zIm[i];
      sumIm[i] = scale * zIm[n + i] + sRe * zIm[i] + sIm * zRe[i];
    }
    loadRe.fill(0);
    loadIm.fill(0);
    mass.addInto(load, 1, 0, this.#sum);
    velocity.addInto(load, 1, 0, { re: zRe.subarray(0, n), im: zIm.subarray(0, n) });
    this.#factor.solveInPlace(asColumn(load));
    const { re: outRe, im: outIm } = out;
    for (let i = 0; i < n; i++) {
      const xRe = -loadRe[i];
      const xIm = -loadIm[i];
      outRe[i] = xRe;
      outIm[i] = xIm;
      outRe[n + i] = (zRe[i] + sRe * xRe - sIm * xIm) / scale;
      outIm[n + i] = (zIm[i] + sRe * xIm + sIm * xRe) / scale;
    }
  }
}
