/**
 * Dense matrices, column-major: entry (i, j) stands at `values[i + j * rows]`.
 * Complex data are two real arrays of the same layout.
 */

export interface DenseMatrix {
  readonly rows: number;
  readonly cols: number;
  readonly values: Float64Array;
}

export interface ComplexMatrix {
  readonly rows: number;
  readonly cols: number;
  readonly re: Float64Array;
  readonly im: Float64Array;
}

export interface ComplexVector {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

export function zeros(rows: number, cols: number): DenseMatrix {
  return { rows, cols, values: new Float64Array(rows * cols) };
}

export function complexZeros(rows: number, cols: number): ComplexMatrix {
  return { rows, cols, re: new Float64Array(rows * cols), im: new Float64Array(rows * cols) };
}

export function complexVector(length: number): ComplexVector {
  return { re: new Float64Array(length), im: new Float64Array(length) };
}

/** A view (no copy) of column j. */
export function column(a: DenseMatrix, j: number): Float64Array {
  return a.values.subarray(j * a.rows, (j + 1) * a.rows);
}

/** A view (no copy) of column j. */
export function complexColumn(a: ComplexMatrix, j: number): ComplexVector {
  return { re: a.re.subarray(j * a.rows, (j + 1) * a.rows), im: a.im.subarray(j * a.rows, (j + 1) * a.rows) };
}
