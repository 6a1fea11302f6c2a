/**
 * C ← C − op(A) B for real column-major blocks, by packed panels and a register block of
 * 2·width × 4. Addresses are bytes, strides and sizes are counted in doubles.
 *
 * Source: Goto & van de Geijn, ACM TOMS 34(3), 2008.
 */

import { copyPadded, multiplyAdd, splatAt, subtractLanes, widthOf, zero } from "./lanes";
import { PACKED_LEFT, PACKED_RIGHT } from "./layout";

/** Depth, columns and rows packed at a time. */
const DEPTH: i32 = 64;
const COLUMNS: i32 = 512;
const ROWS: i32 = 64;

/** op(A) = A (m×k at `a`), or Aᵀ when `transposed` (then A is k×m); B is k×n, C m×n and overlaps neither. */
export function subtractRealProduct<V>(
  c: usize,
  cStride: i32,
  a: usize,
  aStride: i32,
  b: usize,
  bStride: i32,
  m: i32,
  n: i32,
  k: i32,
  transposed: bool,
): void {
  for (let j0 = 0; j0 < n; j0 += COLUMNS) {
    const columns = min(COLUMNS, n - j0);
    for (let p0 = 0; p0 < k; p0 += DEPTH) {
      const depth = min(DEPTH, k - p0);
      packRight(b + ((<usize>(p0 + j0 * bStride)) << 3), bStride, columns, depth);
      for (let i0 = 0; i0 < m; i0 += ROWS) {
        const rows = min(ROWS, m - i0);
        if (transposed) packLeftTransposed<V>(a + ((<usize>(p0 + i0 * aStride)) << 3), aStride, rows, depth);
        else packLeft<V>(a + ((<usize>(i0 + p0 * aStride)) << 3), aStride, rows, depth);
        subtractPacked<V>(c + ((<usize>(i0 + j0 * cStride)) << 3), cStride, rows, columns, depth);
      }
    }
  }
}

/** Fours of columns, row by row; missing columns are zero. */
function packRight(b: usize, stride: i32, columns: i32, depth: i32): void {
  let to = PACKED_RIGHT;
  const step = (<usize>stride) << 3;
  for (let j = 0; j < columns; j += 4) {
    const left = columns - j;
    for (let p: usize = 0; p < (<usize>depth) << 3; p += 8, to += 32) {
      store<f64>(to, load<f64>(b + p));
      store<f64>(to, left > 1 ? load<f64>(b + step + p) : 0, 8);
      store<f64>(to, left > 2 ? load<f64>(b + 2 * step + p) : 0, 16);
      store<f64>(to, left > 3 ? load<f64>(b + 3 * step + p) : 0, 24);
    }
    b += 4 * step;
  }
}

/** Strips of 2·width rows, column by column; missing rows are zero. */
function packLeft<V>(a: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  const step = (<usize>stride) << 3;
  let to = PACKED_LEFT;
  for (let i = 0; i < rows; i += strip) {
    const left = rows - i;
    let from = a + ((<usize>i) << 3);
    for (let p = 0; p < depth; p++) {
      if (left >= strip) {
        store<V>(to, load<V>(from));
        store<V>(to + half, load<V>(from + half));
      } else copyPadded(to, from, left, strip);
      to += 2 * half;
      from += step;
    }
  }
}

/** The same for Aᵀ, whose rows are the columns of A. */
function packLeftTransposed<V>(a: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  for (let i = 0; i < rows; i += strip) {
    for (let t = 0; t < strip; t++) {
      let to = PACKED_LEFT + ((<usize>(i * depth + t)) << 3);
      const column = a + ((<usize>((i + t) * stride)) << 3);
      const inside = i + t < rows;
      for (let p: usize = 0; p < (<usize>depth) << 3; p += 8, to += 2 * half) {
        store<f64>(to, inside ? load<f64>(column + p) : 0);
      }
    }
  }
}

function subtractPacked<V>(c: usize, cStride: i32, rows: i32, columns: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  const step = (<usize>cStride) << 3;
  for (let j = 0; j < columns; j += 4) {
    const bBegin = PACKED_RIGHT + ((<usize>(j * depth)) << 3);
    const bEnd = bBegin + ((<usize>depth) << 5);
    let a = PACKED_LEFT;
    for (let i = 0; i < rows; i += strip) {
      let s00 = zero<V>();
      let s10 = zero<V>();
      let s01 = zero<V>();
      let s11 = zero<V>();
      let s02 = zero<V>();
      let s12 = zero<V>();
      let s03 = zero<V>();
      let s13 = zero<V>();
      for (let b = bBegin; b < bEnd; b += 32, a += 2 * half) {
        const a0 = load<V>(a);
        const a1 = load<V>(a + half);
        const b0 = splatAt<V>(b);
        s00 = multiplyAdd<V>(a0, b0, s00);
        s10 = multiplyAdd<V>(a1, b0, s10);
        const b1 = splatAt<V>(b + 8);
        s01 = multiplyAdd<V>(a0, b1, s01);
        s11 = multiplyAdd<V>(a1, b1, s11);
        const b2 = splatAt<V>(b + 16);
        s02 = multiplyAdd<V>(a0, b2, s02);
        s12 = multiplyAdd<V>(a1, b2, s12);
        const b3 = splatAt<V>(b + 24);
        s03 = multiplyAdd<V>(a0, b3, s03);
        s13 = multiplyAdd<V>(a1, b3, s13);
      }
      const at = c + ((<usize>i) << 3);
      const left = rows - i;
      subtractLanes<V>(at, s00, s10, left);
      if (j + 1 < columns) subtractLanes<V>(at + step, s01, s11, left);
      if (j + 2 < columns) subtractLanes<V>(at + 2 * step, s02, s12, left);
      if (j + 3 < columns) subtractLanes<V>(at + 3 * step, s03, s13, left);
    }
    c += 4 * step;
  }
}
