import { NumericalError } from "../../errors.js";
import { addProductInto, addTransposedProductInto } from "../dense/block-kernels.js";
import { column, type DenseMatrix, zeros } from "../dense/matrix.js";
import { multiply, wholeBlock } from "../dense/products.js";
import { type SymmetricEigen, symmetricEigen } from "../dense/symmetric-eigen.js";
import type { Random } from "../random.js";

/** The pencil K x = λ M x, M symmetric positive semidefinite, seen through A = (K − μM)⁻¹ M. */
export interface ShiftInvertProblem {
  readonly order: number;
  /** μ, no eigenvalue. */
  readonly shift: number;
  /** y ← M x, without aliasing. */
  applyMassInto(y: Float64Array, x: Float64Array): void;
  /** b ← (K − μM)⁻¹ b for every column. */
  solveInPlace(b: DenseMatrix): void;
}

/** Ritz pairs (θ, V s) of A with the M-norms of A V s − θ V s. */
export interface RitzPairs {
  /** θ ascending and the vectors s as columns. */
  readonly eigen: SymmetricEigen;
  /** E S, one row per column of the block ahead. */
  readonly ahead: DenseMatrix;
  readonly residuals: Float64Array;
}

// Below this share of its length a vector counts as dependent on the basis.
const dependent = 1e-13;
const passes = 5;
const attempts = 3;

/**
 * A Krylov relation of A in the M inner product,
 *
 *     A V = V T + W E,   [V W]ᵀ M [V W] = I,   T symmetric,
 *
 * V of `size` columns and W the block of `ahead` columns that comes next.
 * W is full of fresh random vectors where the Krylov space has ended; it has
 * no column only when the range of A is exhausted.
 */
export class KrylovBasis {
  size = 0;
  ahead = 0;
  /** Columns solved for so far. */
  solves = 0;
  private readonly problem: ShiftInvertProblem;
  private readonly random: Random;
  private readonly block: number;
  // V, W and room for the block after W, n rows each, and M times them.
  private readonly v: Float64Array;
  private readonly massV: Float64Array;
  private readonly t: Float64Array;
  private readonly tStride: number;
  private coupling: DenseMatrix = zeros(0, 0);
  /** First column of V that `coupling` ties to W: the three-term recurrence begins there. */
  private coupledFrom = 0;

  /** @param capacity - Largest size; `expand` may be called while size + ahead stays within it. */
  constructor(problem: ShiftInvertProblem, block: number, capacity: number, random: Random) {
    this.problem = problem;
    this.random = random;
    this.block = block;
    this.tStride = capacity;
    this.v = new Float64Array(problem.order * (capacity + 2 * block));
    this.massV = new Float64Array(problem.order * (capacity + 2 * block));
    this.t = new Float64Array(capacity * capacity);
    this.fillAhead();
  }

  /** Takes the block ahead into V and makes the next one. */
  expand(): void {
    const n = this.problem.order;
    const width = this.ahead;
    const end = this.size + width;
    const w = this.columns(end, width);
    w.values.set(this.massV.subarray(this.size * n, end * n));
    this.solve(w);
    // What the recurrence knows of is taken out first, so that the pass over all of V only has rounding to remove.
    const from = this.coupledFrom;
    const projection = this.projectOut(end, w, from);
    const correction = this.projectOut(end, w);
    for (let j = 0; j < width; j++) {
      for (let i = 0; i < end; i++) {
        const known = i < from ? 0 : projection.values[i - from + j * (end - from)];
        const entry = known + correction.values[i + j * end];
        this.t[i + (this.size + j) * this.tStride] = entry;
        this.t[this.size + j + i * this.tStride] = entry;
      }
    }
    this.size = end;
    this.ahead = 0;
    const r = zeros(width, width);
    for (let j = 0; j < width; j++) {
      this.copyColumn(end + j, end + this.ahead);
      const scale = Math.hypot(columnNorm(projection, j), columnNorm(correction, j));
      if (this.acceptColumn(scale, columnNorm(correction, j), r.values.subarray(j * width))) this.ahead++;
    }
    this.fillAhead();
    this.coupling = zeros(this.ahead, end);
    const rows = Math.min(width, this.ahead);
    for (let j = 0; j < width; j++) {
      for (let i = 0; i < rows; i++) {
        this.coupling.values[i + (end - width + j) * this.ahead] = r.values[i + j * width];
      }
    }
    this.coupledFrom = end - width;
  }

  /** Rayleigh–Ritz: O(size³). */
  ritzPairs(): RitzPairs {
    const k = this.size;
    const t = zeros(k, k);
    for (let j = 0; j < k; j++) {
      t.values.set(this.t.subarray(j * this.tStride, j * this.tStride + k), j * k);
    }
    const eigen = symmetricEigen(t);
    const ahead = multiply(this.coupling, eigen.vectors);
    return { eigen, ahead, residuals: Float64Array.from({ length: k }, (_, j) => columnNorm(ahead, j)) };
  }

  /**
   * The vectors A V s / θ = V s + W E s / θ of the chosen pairs. The part of V in the
   * null space of M, which grows unseen by the M-norm, drops out by this as far as the
   * recurrence knows it; if one solve with a mix of all vectors x still shows
   * x ≠ A x / θ beyond `tolerance`, each is pushed through A once more.
   *
   * Source: Nour-Omid, Parlett, Ericsson & Jensen, Math. Comp. 48(178), 1987, pp. 663–673.
   */
  purified(pairs: RitzPairs, chosen: readonly number[], tolerance: number): DenseMatrix {
    const theta = Float64Array.from(chosen, (j) => pairs.eigen.values[j]);
    const x = multiply(this.columns(0, this.size + this.ahead), this.purifiedCoefficients(pairs, chosen));
    if (x.cols === 0) return x;
    const signs = zeros(x.cols, 2);
    for (let j = 0; j < x.cols; j++) {
      signs.values[j] = this.random.uniform() < 0.5 ? -1 : 1;
      signs.values[x.cols + j] = signs.values[j] / theta[j];
    }
    const mixed = multiply(x, signs);
    const plain = column(mixed, 0);
    const pushed: DenseMatrix = { rows: x.rows, cols: 1, values: column(mixed, 1) };
    this.applyOperator(pushed);
    let change = 0;
    for (let i = 0; i < x.rows; i++) change += (pushed.values[i] - plain[i]) ** 2;
    if (change <= x.cols * tolerance * tolerance * dot(plain, plain)) return x;
    this.applyOperator(x);
    for (let j = 0; j < x.cols; j++) {
      for (let i = j * x.rows; i < (j + 1) * x.rows; i++) x.values[i] /= theta[j];
    }
    return x;
  }

  // x ← A x.
  private applyOperator(x: DenseMatrix): void {
    const image = new Float64Array(x.rows);
    for (let j = 0; j < x.cols; j++) {
      this.problem.applyMassInto(image, column(x, j));
      column(x, j).set(image);
    }
    this.solve(x);
  }

  /** Thick restart: keeps the chosen pairs and the block ahead. */
  restart(pairs: RitzPairs, chosen: readonly number[]): void {
    const k = this.size;
    const coefficients = zeros(k, chosen.length);
    const coupling = zeros(this.ahead, chosen.length);
    chosen.forEach((from, to) => {
      coefficients.values.set(pairs.eigen.vectors.values.subarray(from * k, (from + 1) * k), to * k);
      const e = pairs.ahead.values.subarray(from * this.ahead, (from + 1) * this.ahead);
      coupling.values.set(e, to * this.ahead);
    });
    this.combine(coefficients);
    this.setDiagonal(pairs, chosen);
    for (let j = 0; j < this.ahead; j++) this.copyColumn(k + j, this.size + j);
    this.coupling = coupling;
    this.coupledFrom = 0;
  }

  /** Keeps only the chosen, converged pairs and goes on with fresh random vectors. */
  restartDeflated(pairs: RitzPairs, chosen: readonly number[]): void {
    this.combine(this.purifiedCoefficients(pairs, chosen));
    this.setDiagonal(pairs, chosen);
    this.ahead = 0;
    this.fillAhead();
    this.coupling = zeros(this.ahead, this.size);
    this.coupledFrom = 0;
  }

  private purifiedCoefficients(pairs: RitzPairs, chosen: readonly number[]): DenseMatrix {
    const k = this.size;
    const out = zeros(k + this.ahead, chosen.length);
    chosen.forEach((from, to) => {
      const at = to * (k + this.ahead);
      out.values.set(pairs.eigen.vectors.values.subarray(from * k, (from + 1) * k), at);
      for (let i = 0; i < this.ahead; i++) {
        out.values[at + k + i] = pairs.ahead.values[i + from * this.ahead] / pairs.eigen.values[from];
      }
    });
    return out;
  }

  private setDiagonal(pairs: RitzPairs, chosen: readonly number[]): void {
    this.size = chosen.length;
    this.t.fill(0);
    chosen.forEach((from, to) => {
      this.t[to + to * this.tStride] = pairs.eigen.values[from];
    });
  }

  // V ← [V W] C and M V along, in slabs of rows so that little extra memory is used.
  private combine(coefficients: DenseMatrix): void {
    const n = this.problem.order;
    const { rows: k, cols } = coefficients;
    const slab = 128;
    const work = zeros(slab, cols);
    for (const x of [this.v, this.massV]) {
      for (let top = 0; top < n; top += slab) {
        const height = Math.min(slab, n - top);
        work.values.fill(0);
        const source = { values: x, at: top, stride: n };
        addProductInto(wholeBlock(work), 1, source, wholeBlock(coefficients), height, cols, k);
        for (let j = 0; j < cols; j++) {
          x.set(work.values.subarray(j * slab, j * slab + height), top + j * n);
        }
      }
    }
  }

  /** Fills W up to the block size with random vectors pushed through A, while any are independent. */
  private fillAhead(): void {
    const n = this.problem.order;
    let failures = 0;
    while (this.ahead < this.block && this.size + this.ahead < n && failures < attempts) {
      const at = this.size + this.ahead;
      const x = this.columns(at, 1);
      for (let i = 0; i < n; i++) x.values[i] = this.random.normal();
      this.applyOperator(x);
      const scale = columnNorm(this.projectOut(at, x), 0);
      const correction = columnNorm(this.projectOut(at, x), 0);
      if (this.acceptColumn(scale, correction, null)) this.ahead++;
      else failures++;
    }
  }

  /**
   * Makes the column after [V W], already twice projected against V, orthogonal
   * to W and of M-norm 1, again and again until a pass removes little; false
   * where it is dependent.
   *
   * @param scale - M-norm of what was removed from the column in all.
   * @param removed - M-norm of what the last pass removed.
   * @param r - Adds the coefficients: entry i for column i of W, the last one for the norm.
   */
  private acceptColumn(scale: number, removed: number, r: Float64Array | null): boolean {
    const at = this.size + this.ahead;
    const x = this.columns(at, 1);
    const massX = this.massColumn(at);
    let lost = removed;
    let length = scale;
    for (let pass = 0; pass < passes; pass++) {
      // Pass 0 needs W only: V has been projected out before.
      const first = pass === 0 ? this.size : 0;
      const c = this.projectOut(at, x, first);
      if (r !== null) for (let i = 0; i < this.ahead; i++) r[i] += c.values[this.size - first + i];
      lost = Math.hypot(pass === 0 ? lost : 0, columnNorm(c, 0));
      const norm = this.massNorm(x.values, massX);
      length = Math.hypot(length, norm, lost);
      if (norm <= dependent * length) return false;
      if (lost > norm) continue;
      for (let i = 0; i < massX.length; i++) {
        x.values[i] /= norm;
        massX[i] /= norm;
      }
      if (r !== null) r[this.ahead] += norm;
      return true;
    }
    return false;
  }

  // Leaves M x in massX.
  private massNorm(x: Float64Array, massX: Float64Array): number {
    this.problem.applyMassInto(massX, x);
    const square = dot(x, massX);
    if (Number.isNaN(square) || square === Number.POSITIVE_INFINITY) throw notFinite();
    return Math.sqrt(Math.max(0, square));
  }

  /** x ← x − V (M V)ᵀ x over columns `first` … `end` − 1 of [V W]; returns the coefficients. */
  private projectOut(end: number, x: DenseMatrix, first = 0): DenseMatrix {
    const n = this.problem.order;
    const c = zeros(end - first, x.cols);
    const [basis, dual] = [this.v, this.massV].map((values) => ({ values, at: first * n, stride: n }));
    addTransposedProductInto(wholeBlock(c), 1, dual, wholeBlock(x), c.rows, x.cols, n);
    addProductInto(wholeBlock(x), -1, basis, wholeBlock(c), n, x.cols, c.rows);
    return c;
  }

  private solve(b: DenseMatrix): void {
    this.problem.solveInPlace(b);
    this.solves += b.cols;
  }

  private columns(first: number, count: number): DenseMatrix {
    const n = this.problem.order;
    return { rows: n, cols: count, values: this.v.subarray(first * n, (first + count) * n) };
  }

  private massColumn(j: number): Float64Array {
    const n = this.problem.order;
    return this.massV.subarray(j * n, (j + 1) * n);
  }

  private copyColumn(from: number, to: number): void {
    const n = this.problem.order;
    if (from === to) return;
    this.v.copyWithin(to * n, from * n, (from + 1) * n);
    this.massV.copyWithin(to * n, from * n, (from + 1) * n);
  }
}

function columnNorm(a: DenseMatrix, j: number): number {
  let sum = 0;
  for (let i = j * a.rows; i < (j + 1) * a.rows; i++) sum += a.values[i] * a.values[i];
  return Math.sqrt(sum);
}

function dot(x: Float64Array, y: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < x.length; i++) sum += x[i] * y[i];
  return sum;
}

function notFinite(): NumericalError {
  return new NumericalError(
    "numerics.not-finite",
    "A solve with K − μM gave numbers that are not finite.",
    "Check the matrices for entries of absurd size, or a shift that is an eigenvalue.",
  );
}
