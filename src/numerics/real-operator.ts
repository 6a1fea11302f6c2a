import type { ComplexVector, DenseMatrix } from "./dense/matrix.js";
import { complexVector } from "./dense/matrix.js";
import { addRealProductInto, addRealTransposedProductInto } from "./sparse/real-sparse-products.js";
import type { SparseMatrix } from "./sparse/sparse-matrix.js";

/** A real matrix A, dense or sparse, known by its products with complex vectors. Arguments must not alias. */
export interface RealOperator {
  readonly rows: number;
  readonly cols: number;
  /** y ← y + c A x, c = cRe + i cIm. */
  addInto(y: ComplexVector, cRe: number, cIm: number, x: ComplexVector): void;
  /** y ← y + c Aᵀ x, c = cRe + i cIm. */
  addTransposedInto(y: ComplexVector, cRe: number, cIm: number, x: ComplexVector): void;
  /** Largest absolute row or column sum, an upper bound of the 2-norm. */
  readonly normBound: number;
  /** A itself where it is sparse: matrices on one pattern can share a pass. */
  readonly sparse: SparseMatrix | null;
}

export function sparseOperator(a: SparseMatrix): RealOperator {
  let normBound: number | undefined;
  return {
    rows: a.rows,
    cols: a.cols,
    addInto: (y, cRe, cIm, x) => addRealProductInto(y, cRe, cIm, a, x),
    addTransposedInto: (y, cRe, cIm, x) => addRealTransposedProductInto(y, cRe, cIm, a, x),
    get normBound() {
      normBound ??= sparseNormBound(a);
      return normBound;
    },
    sparse: a,
  };
}

export function denseOperator(a: DenseMatrix): RealOperator {
  let normBound: number | undefined;
  return {
    rows: a.rows,
    cols: a.cols,
    addInto: (y, cRe, cIm, x) => addDenseInto(y, cRe, cIm, a, x),
    addTransposedInto: (y, cRe, cIm, x) => addDenseTransposedInto(y, cRe, cIm, a, x),
    get normBound() {
      normBound ??= denseNormBound(a);
      return normBound;
    },
    sparse: null,
  };
}

/** y = A x for complex x, a new vector. */
export function applyComplex(a: RealOperator, x: ComplexVector): ComplexVector {
  const y = complexVector(a.rows);
  a.addInto(y, 1, 0, x);
  return y;
}

/** y = Aᵀ x for complex x, a new vector (A is real, so Aᵀ = Aᴴ). */
export function applyComplexTransposed(a: RealOperator, x: ComplexVector): ComplexVector {
  const y = complexVector(a.cols);
  a.addTransposedInto(y, 1, 0, x);
  return y;
}

function addDenseInto(y: ComplexVector, cRe: number, cIm: number, a: DenseMatrix, x: ComplexVector): void {
  const { rows, cols, values } = a;
  const { re: yRe, im: yIm } = y;
  for (let j = 0; j < cols; j++) {
    const re = cRe * x.re[j] - cIm * x.im[j];
    const im = cRe * x.im[j] + cIm * x.re[j];
    for (let i = 0, p = j * rows; i < rows; i++, p++) {
      yRe[i] += values[p] * re;
      yIm[i] += values[p] * im;
    }
  }
}

function addDenseTransposedInto(
  y: ComplexVector,
  cRe: number,
  cIm: number,
  a: DenseMatrix,
  x: ComplexVector,
): void {
  const { rows, cols, values } = a;
  const { re: xRe, im: xIm } = x;
  for (let j = 0; j < cols; j++) {
    let re = 0;
    let im = 0;
    for (let i = 0, p = j * rows; i < rows; i++, p++) {
      re += values[p] * xRe[i];
      im += values[p] * xIm[i];
    }
    y.re[j] += cRe * re - cIm * im;
    y.im[j] += cRe * im + cIm * re;
  }
}

function sparseNormBound(a: SparseMatrix): number {
  const rowSum = new Float64Array(a.rows);
  let largest = 0;
  for (let j = 0; j < a.cols; j++) {
    let sum = 0;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) {
      const size = Math.abs(a.values[p]);
      sum += size;
      rowSum[a.rowIndex[p]] += size;
    }
    largest = Math.max(largest, sum);
  }
  return rowSum.reduce((high, sum) => Math.max(high, sum), largest);
}

function denseNormBound(a: DenseMatrix): number {
  const rowSum = new Float64Array(a.rows);
  let largest = 0;
  for (let j = 0; j < a.cols; j++) {
    let sum = 0;
    for (let i = 0; i < a.rows; i++) {
      const size = Math.abs(a.values[i + j * a.rows]);
      sum += size;
      rowSum[i] += size;
    }
    largest = Math.max(largest, sum);
  }
  return rowSum.reduce((high, sum) => Math.max(high, sum), largest);
}
