/** C ← C − op(A) B for real column-major blocks. Addresses are bytes, strides and sizes doubles. */

import { widthOf } from "./lanes";
import { COLUMNS, DEPTH, LEFT, RIGHT, ROWS, TILE, TILE_COLUMNS } from "./layout";
import { multiplyTile, packLeft, packLeftTransposed, packRight, subtractTile } from "./tiles";

/** op(A) = A (m×k at `a`), or Aᵀ when `transposed` (then A is k×m); B is k×n, C m×n and overlaps neither. */
export function subtractRealProduct(
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
      packRight(RIGHT, b + ((<usize>(p0 + j0 * bStride)) << 3), bStride, columns, depth);
      for (let i0 = 0; i0 < m; i0 += ROWS) {
        const rows = min(ROWS, m - i0);
        if (transposed) {
          packLeftTransposed(LEFT, a + ((<usize>(p0 + i0 * aStride)) << 3), aStride, rows, depth);
        } else packLeft(LEFT, a + ((<usize>(i0 + p0 * aStride)) << 3), aStride, rows, depth);
        subtractPacked(c + ((<usize>(i0 + j0 * cStride)) << 3), cStride, rows, columns, depth);
      }
    }
  }
}

function subtractPacked(c: usize, cStride: i32, rows: i32, columns: i32, depth: i32): void {
  const strip = 2 * widthOf();
  for (let j = 0; j < columns; j += TILE_COLUMNS) {
    const b = RIGHT + ((<usize>(j * depth)) << 3);
    for (let i = 0; i < rows; i += strip) {
      multiplyTile(TILE, LEFT + ((<usize>(i * depth)) << 3), b, depth);
      const at = c + ((<usize>(i + j * cStride)) << 3);
      subtractTile(at, TILE, cStride, min(strip, rows - i), min(TILE_COLUMNS, columns - j));
    }
  }
}
