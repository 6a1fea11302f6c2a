import type { ComplexVector, DenseMatrix } from "./dense/matrix.js";
import { complexVector } from "./dense/matrix.js";
import type { SparseMatrix } from "./sparse/sparse-matrix.js";
import { multiplyAddInto, multiplyTransposedAddInto } from "./sparse/sparse-matrix.js";

/** A real matrix A, dense or sparse, known by its products. Arguments must not alias. */
export interface RealOperator {
  readonly rows: number;
  readonly cols: number;
  /** y ← y + α A x. */
  addInto(y: Float64Array, alpha: number, x: Float64Array): void;
  /** y ← y + α Aᵀ x. */
  addTransposedInto(y: Float64Array, alpha: number, x: Float64Array): void;
  /** Largest absolute row or column sum, an upper bound of the 2-norm. */
  readonly normBound: number;
}

export function sparseOperator(a: SparseMatrix): RealOperator {
  return {
    rows: a.rows,
    cols: a.cols,
    addInto: (y, alpha, x) => multiplyAddInto(y, alpha, a, x),
    addTransposedInto: (y, alpha, x) => multiplyTransposedAddInto(y, alpha, a, x),
    normBound: sparseNormBound(a),
  };
}

export function denseOperator(a: DenseMatrix): RealOperator {
  const { rows, cols, values } = a;
  return {
    rows,
    cols,
    addInto: (y, alpha, x) => {
      for (let j = 0; j < cols; j++) {
        const scaled = alpha * x[j];
        for (let i = 0, p = j * rows; i < rows; i++, p++) y[i] += values[p] * scaled;
      }
    },
    addTransposedInto: (y, alpha, x) => {
      for (let j = 0; j < cols; j++) {
        let sum = 0;
        for (let i = 0, p = j * rows; i < rows; i++, p++) sum += values[p] * x[i];
        y[j] += alpha * sum;
      }
    },
    normBound: denseNormBound(a),
  };
}

/** y = A x for complex x, a new vector. */
export function applyComplex(a: RealOperator, x: ComplexVector): ComplexVector {
  const y = complexVector(a.rows);
  a.addInto(y.re, 1, x.re);
  a.addInto(y.im, 1, x.im);
  return y;
}

/** y = Aᵀ x for complex x, a new vector (A is real, so Aᵀ = Aᴴ). */
export function applyComplexTransposed(a: RealOperator, x: ComplexVector): ComplexVector {
  const y = complexVector(a.cols);
  a.addTransposedInto(y.re, 1, x.re);
  a.addTransposedInto(y.im, 1, x.im);
  return y;
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
