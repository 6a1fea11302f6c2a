import type { Triplets } from "./problem.js";

/** factor·Aᵀ. */
export function transposed(a: Triplets, factor = 1): Triplets {
  const value = factor === 1 ? a.value : a.value.map((x) => factor * x);
  return { rows: a.cols, cols: a.rows, row: a.col, col: a.row, value };
}

/** A + B with every place once, ordered by column, then row. Two stable counting sorts: O(entries + rows + cols). */
export function add(a: Triplets, b: Triplets): Triplets {
  const { rows, cols } = a;
  const count = a.value.length + b.value.length;
  const row = new Int32Array(count);
  const col = new Int32Array(count);
  const value = new Float64Array(count);
  row.set(a.row);
  row.set(b.row, a.row.length);
  col.set(a.col);
  col.set(b.col, a.col.length);
  value.set(a.value);
  value.set(b.value, a.value.length);

  const order = sortBy(col, cols, sortBy(row, rows, Int32Array.from(row.keys())));
  const outRow = new Int32Array(count);
  const outCol = new Int32Array(count);
  const outValue = new Float64Array(count);
  let end = 0;
  for (const t of order) {
    if (end > 0 && outRow[end - 1] === row[t] && outCol[end - 1] === col[t]) {
      outValue[end - 1] += value[t];
    } else {
      outRow[end] = row[t];
      outCol[end] = col[t];
      outValue[end++] = value[t];
    }
  }
  return { rows, cols, row: outRow.slice(0, end), col: outCol.slice(0, end), value: outValue.slice(0, end) };
}

/** `order` sorted by key[order[·]] from 0 to keys − 1, stably. */
function sortBy(key: Int32Array, keys: number, order: Int32Array): Int32Array {
  const next = new Int32Array(keys + 1);
  for (let t = 0; t < key.length; t++) next[key[t] + 1]++;
  for (let k = 0; k < keys; k++) next[k + 1] += next[k];
  const sorted = new Int32Array(order.length);
  for (let t = 0; t < order.length; t++) sorted[next[key[order[t]]]++] = order[t];
  return sorted;
}
