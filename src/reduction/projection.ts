import type { DenseMatrix } from "../numerics/dense/matrix.js";
import { column, zeros } from "../numerics/dense/matrix.js";
import { multiplyTransposed } from "../numerics/dense/products.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { multiplyTransposedAddInto, transpose } from "../numerics/sparse/sparse-matrix.js";

/**
 * VᵀAV, given the leading block `before` for the first `known` columns of V. Only the rows
 * that A touches are gathered: a layer's patch costs what the patch is worth, not the model.
 *
 * @param symmetry - 1 symmetric, −1 skew, 0 neither: with a symmetry the other half is copied.
 */
export function projectSquare(
  a: SparseMatrix,
  symmetry: 1 | -1 | 0,
  v: DenseMatrix,
  before: DenseMatrix,
  known: number,
): DenseMatrix {
  const r = v.cols;
  const local = compress(a);
  const vLocal = gatherRows(v, local.support);
  const fresh = lastColumns(vLocal, known);
  const out = zeros(r, r);
  for (let j = 0; j < known; j++) out.values.set(column(before, j), j * r);

  const right = multiplyTransposed(vLocal, apply(local.matrix, fresh));
  for (let j = known; j < r; j++) out.values.set(column(right, j - known), j * r);
  if (known === 0) return out;

  const below = symmetry === 0 ? multiplyTransposed(vLocal, apply(transpose(local.matrix), fresh)) : right;
  const sign = symmetry === -1 ? -1 : 1;
  for (let j = 0; j < known; j++) {
    for (let i = known; i < r; i++) out.values[i + j * r] = sign * below.values[j + (i - known) * r];
  }
  return out;
}

/** VᵀB for a sparse channel matrix B. */
export function projectChannel(b: SparseMatrix, v: DenseMatrix): DenseMatrix {
  const out = zeros(v.cols, b.cols);
  const row = new Float64Array(b.cols);
  for (let j = 0; j < v.cols; j++) {
    row.fill(0);
    multiplyTransposedAddInto(row, 1, b, column(v, j));
    for (let k = 0; k < b.cols; k++) out.values[j + k * v.cols] = row[k];
  }
  return out;
}

interface Compressed {
  readonly support: Int32Array;
  readonly matrix: SparseMatrix;
}

/** A on the rows and columns where it has entries. */
function compress(a: SparseMatrix): Compressed {
  const touched = new Uint8Array(a.rows);
  for (let j = 0; j < a.cols; j++) {
    if (a.colStart[j + 1] > a.colStart[j]) touched[j] = 1;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) touched[a.rowIndex[p]] = 1;
  }
  const place = new Int32Array(a.rows).fill(-1);
  const support: number[] = [];
  for (let i = 0; i < a.rows; i++) {
    if (touched[i] === 1) {
      place[i] = support.length;
      support.push(i);
    }
  }
  const colStart = new Int32Array(support.length + 1);
  support.forEach((j, k) => {
    colStart[k + 1] = colStart[k] + a.colStart[j + 1] - a.colStart[j];
  });
  const matrix = {
    rows: support.length,
    cols: support.length,
    colStart,
    rowIndex: a.rowIndex.map((i) => place[i]),
    values: a.values,
  };
  return { support: Int32Array.from(support), matrix };
}

function gatherRows(v: DenseMatrix, rows: Int32Array): DenseMatrix {
  if (rows.length === v.rows) return v;
  const out = zeros(rows.length, v.cols);
  for (let j = 0; j < v.cols; j++) {
    const from = j * v.rows;
    const to = j * rows.length;
    for (let k = 0; k < rows.length; k++) out.values[to + k] = v.values[from + rows[k]];
  }
  return out;
}

function lastColumns(v: DenseMatrix, from: number): DenseMatrix {
  return { rows: v.rows, cols: v.cols - from, values: v.values.subarray(from * v.rows) };
}

/** A X by way of rows of Aᵀ kept in registers: columns of X one by one. */
function apply(a: SparseMatrix, x: DenseMatrix): DenseMatrix {
  const out = zeros(a.rows, x.cols);
  const rowsOfA = transpose(a);
  for (let j = 0; j < x.cols; j++) multiplyTransposedAddInto(column(out, j), 1, rowsOfA, column(x, j));
  return out;
}
