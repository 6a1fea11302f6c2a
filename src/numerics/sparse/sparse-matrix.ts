/**
 * Sparse matrices by columns: the entries of column j are
 * `values[p]` at row `rowIndex[p]` for p from `colStart[j]` to `colStart[j + 1] - 1`,
 * rows ascending, no duplicates.
 */

/** Positions only. */
export interface SparsePattern {
  readonly rows: number;
  readonly cols: number;
  readonly colStart: Int32Array;
  readonly rowIndex: Int32Array;
}

/** Real sparse matrix. */
export interface SparseMatrix extends SparsePattern {
  readonly values: Float64Array;
}

/** Complex values on a pattern kept elsewhere, in the pattern's order. */
export interface ComplexValues {
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/**
 * Builds a matrix from coordinates (0-based); duplicates are summed, explicit zeros kept.
 * Cost O(nonzeros + rows + cols): two counting sorts.
 */
export function fromTriplets(
  rows: number,
  cols: number,
  rowOf: ArrayLike<number>,
  colOf: ArrayLike<number>,
  entryOf: ArrayLike<number>,
): SparseMatrix {
  const count = entryOf.length;
  const byRow = orderByKey(rowOf, rows, count);
  const order = new Int32Array(count);
  const start = new Int32Array(cols + 1);
  for (let t = 0; t < count; t++) start[colOf[t] + 1]++;
  for (let j = 0; j < cols; j++) start[j + 1] += start[j];
  const next = start.slice(0, cols);
  for (const t of byRow) order[next[colOf[t]]++] = t;

  const colStart = new Int32Array(cols + 1);
  const rowIndex = new Int32Array(count);
  const values = new Float64Array(count);
  let end = 0;
  for (let j = 0; j < cols; j++) {
    const begin = end;
    for (let p = start[j]; p < start[j + 1]; p++) {
      const t = order[p];
      if (end > begin && rowIndex[end - 1] === rowOf[t]) {
        values[end - 1] += entryOf[t];
      } else {
        rowIndex[end] = rowOf[t];
        values[end++] = entryOf[t];
      }
    }
    colStart[j + 1] = end;
  }
  return { rows, cols, colStart, rowIndex: rowIndex.slice(0, end), values: values.slice(0, end) };
}

function orderByKey(keyOf: ArrayLike<number>, keys: number, count: number): Int32Array {
  const next = new Int32Array(keys + 1);
  for (let t = 0; t < count; t++) next[keyOf[t] + 1]++;
  for (let k = 0; k < keys; k++) next[k + 1] += next[k];
  const order = new Int32Array(count);
  for (let t = 0; t < count; t++) order[next[keyOf[t]]++] = t;
  return order;
}

/** Aᵀ, in O(nonzeros). */
export function transpose(a: SparseMatrix): SparseMatrix {
  const { rows, cols, colStart, rowIndex, values } = a;
  const outStart = new Int32Array(rows + 1);
  for (let p = 0; p < values.length; p++) outStart[rowIndex[p] + 1]++;
  for (let i = 0; i < rows; i++) outStart[i + 1] += outStart[i];
  const next = outStart.slice(0, rows);
  const outRow = new Int32Array(values.length);
  const outValues = new Float64Array(values.length);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const q = next[rowIndex[p]]++;
      outRow[q] = j;
      outValues[q] = values[p];
    }
  }
  return { rows: cols, cols: rows, colStart: outStart, rowIndex: outRow, values: outValues };
}

/** y ← y + α A x; y and x must not alias. */
export function multiplyAddInto(y: Float64Array, alpha: number, a: SparseMatrix, x: Float64Array): void {
  const { cols, colStart, rowIndex, values } = a;
  for (let j = 0; j < cols; j++) {
    const xj = alpha * x[j];
    if (xj === 0) continue;
    for (let p = colStart[j]; p < colStart[j + 1]; p++) y[rowIndex[p]] += values[p] * xj;
  }
}

/** y ← y + α Aᵀ x; y and x must not alias. */
export function multiplyTransposedAddInto(
  y: Float64Array,
  alpha: number,
  a: SparseMatrix,
  x: Float64Array,
): void {
  const { cols, colStart, rowIndex, values } = a;
  for (let j = 0; j < cols; j++) {
    let sum = 0;
    for (let p = colStart[j]; p < colStart[j + 1]; p++) sum += values[p] * x[rowIndex[p]];
    y[j] += alpha * sum;
  }
}

/** [α₁A₁ α₂A₂ …] side by side; `rows` tells the height when the list is empty. */
export function concatenateScaled(
  rows: number,
  parts: readonly SparseMatrix[],
  factors: ArrayLike<number>,
): SparseMatrix {
  const cols = parts.reduce((sum, a) => sum + a.cols, 0);
  const nonzeros = parts.reduce((sum, a) => sum + a.values.length, 0);
  const colStart = new Int32Array(cols + 1);
  const rowIndex = new Int32Array(nonzeros);
  const values = new Float64Array(nonzeros);
  let col = 0;
  let end = 0;
  parts.forEach((a, k) => {
    rowIndex.set(a.rowIndex, end);
    for (let p = 0; p < a.values.length; p++) values[end + p] = factors[k] * a.values[p];
    for (let j = 0; j < a.cols; j++) colStart[col + j + 1] = end + a.colStart[j + 1];
    col += a.cols;
    end += a.values.length;
  });
  return { rows, cols, colStart, rowIndex, values };
}
