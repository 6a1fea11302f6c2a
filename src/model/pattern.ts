import type { SparseMatrix, SparsePattern } from "../numerics/sparse/sparse-matrix.js";
import { transpose } from "../numerics/sparse/sparse-matrix.js";

/** Union of the patterns of all matrices, of their transposes, and of the diagonal. */
export function mergedPattern(order: number, matrices: readonly SparseMatrix[]): SparsePattern {
  const sources = matrices.flatMap((a) => [a, transpose(a)]);
  const colStart = new Int32Array(order + 1);
  const mark = new Int32Array(order).fill(-1);
  const column: number[] = [];
  let rowIndex = new Int32Array(Math.max(16, 4 * order));
  let end = 0;
  for (let j = 0; j < order; j++) {
    column.length = 0;
    column.push(j);
    mark[j] = j;
    for (const { colStart: start, rowIndex: rows } of sources) {
      for (let p = start[j]; p < start[j + 1]; p++) {
        if (mark[rows[p]] === j) continue;
        mark[rows[p]] = j;
        column.push(rows[p]);
      }
    }
    if (end + column.length > rowIndex.length) {
      const grown = new Int32Array(2 * rowIndex.length + column.length);
      grown.set(rowIndex.subarray(0, end));
      rowIndex = grown;
    }
    rowIndex.set(Int32Array.from(column).sort(), end);
    end += column.length;
    colStart[j + 1] = end;
  }
  return { rows: order, cols: order, colStart, rowIndex: rowIndex.slice(0, end) };
}

/** Position in `pattern` of each entry of `a`; every entry must be there. */
export function entrySlots(pattern: SparsePattern, a: SparseMatrix): Int32Array {
  const slots = new Int32Array(a.values.length);
  const place = new Int32Array(pattern.rows);
  for (let j = 0; j < a.cols; j++) {
    for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) place[pattern.rowIndex[p]] = p;
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) slots[p] = place[a.rowIndex[p]];
  }
  return slots;
}
