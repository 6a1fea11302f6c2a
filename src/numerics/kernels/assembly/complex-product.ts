/**
 * C ← C − op(A) B for complex column-major blocks in split storage, by three real products
 * instead of four. Addresses are bytes, strides and sizes are counted in doubles.
 *
 * With T₁ = A_r B_r, T₂ = t² A_i B_i and T₃ = (A_r + t A_i)(B_r + t B_i) the product is
 *
 *     T₁ − T₂/t² + i (T₃ − T₁ − T₂)/t.
 *
 * For t = 1 the imaginary part carries rounding errors of the size of the real one: of light
 * damping little would be left. A power of two t that makes both parts about as large gives
 * each an error of its own size.
 *
 * Source: Higham, SIAM J. Matrix Anal. Appl. 13(3), 1992 (three products); the scaling is ours.
 */

import {
  larger,
  largestLane,
  magnitude,
  multiply,
  multiplyAdd,
  splat,
  subtract,
  widthOf,
  zero,
} from "./lanes";
import {
  COLUMNS,
  DEPTH,
  LEFT,
  LEFT_SECOND,
  LEFT_THIRD,
  RIGHT,
  RIGHT_SECOND,
  RIGHT_THIRD,
  ROWS,
  TILE,
  TILE_COLUMNS,
  TILE_SECOND,
  TILE_THIRD,
} from "./layout";
import { multiplyTile, packLeft, packLeftTransposed, packRight, subtractTile } from "./tiles";

/** op(A) = A (m×k at `a`), or Aᴴ when `adjoint` (then A is k×m); B is k×n, C m×n and overlaps neither. */
export function subtractComplexProduct<V>(
  cRe: usize,
  cIm: usize,
  cStride: i32,
  aRe: usize,
  aIm: usize,
  aStride: i32,
  bRe: usize,
  bIm: usize,
  bStride: i32,
  m: i32,
  n: i32,
  k: i32,
  adjoint: bool,
): void {
  for (let j0 = 0; j0 < n; j0 += COLUMNS) {
    const columns = min(COLUMNS, n - j0);
    for (let p0 = 0; p0 < k; p0 += DEPTH) {
      const depth = min(DEPTH, k - p0);
      const right = (<usize>(p0 + j0 * bStride)) << 3;
      packRight(RIGHT, bRe + right, bStride, columns, depth);
      packRight(RIGHT_SECOND, bIm + right, bStride, columns, depth);
      const t = balance<V>(RIGHT, RIGHT_SECOND, roundUp(columns, TILE_COLUMNS) * depth);
      addScaled<V>(RIGHT_THIRD, RIGHT, RIGHT_SECOND, t, roundUp(columns, TILE_COLUMNS) * depth);
      for (let i0 = 0; i0 < m; i0 += ROWS) {
        const rows = min(ROWS, m - i0);
        const left = (<usize>(adjoint ? p0 + i0 * aStride : i0 + p0 * aStride)) << 3;
        if (adjoint) {
          packLeftTransposed<V>(LEFT, aRe + left, aStride, rows, depth);
          packLeftTransposed<V>(LEFT_SECOND, aIm + left, aStride, rows, depth);
        } else {
          packLeft<V>(LEFT, aRe + left, aStride, rows, depth);
          packLeft<V>(LEFT_SECOND, aIm + left, aStride, rows, depth);
        }
        const sign: f64 = adjoint ? -1 : 1;
        addScaled<V>(LEFT_THIRD, LEFT, LEFT_SECOND, sign * t, roundUp(rows, 2 * widthOf<V>()) * depth);
        const target = (<usize>(i0 + j0 * cStride)) << 3;
        subtractPacked<V>(cRe + target, cIm + target, cStride, rows, columns, depth, t, sign);
      }
    }
  }
}

function roundUp(size: i32, unit: i32): i32 {
  return ((size + unit - 1) / unit) * unit;
}

/** The power of two that makes the largest imaginary part about as large as the largest real one. */
function balance<V>(re: usize, im: usize, count: i32): f64 {
  let x = zero<V>();
  let y = zero<V>();
  const end = re + ((<usize>count) << 3);
  for (; re < end; re += sizeof<V>(), im += sizeof<V>()) {
    x = larger<V>(x, magnitude<V>(load<V>(re)));
    y = larger<V>(y, magnitude<V>(load<V>(im)));
  }
  const real = largestLane<V>(x);
  const imaginary = largestLane<V>(y);
  if (!(real > 0) || !(imaginary > 0)) return 1;
  // The exponents of two doubles differ by those of their quotient, give or take one.
  const shift = <i32>(reinterpret<i64>(real) >> 52) - <i32>(reinterpret<i64>(imaginary) >> 52);
  return reinterpret<f64>((<i64>(1023 + max(-40, min(40, shift)))) << 52);
}

/** to ← x + t y. */
function addScaled<V>(to: usize, x: usize, y: usize, t: f64, count: i32): void {
  const v = splat<V>(t);
  const end = x + ((<usize>count) << 3);
  for (; x < end; x += sizeof<V>(), y += sizeof<V>(), to += sizeof<V>()) {
    store<V>(to, multiplyAdd<V>(load<V>(y), v, load<V>(x)));
  }
}

function subtractPacked<V>(
  cRe: usize,
  cIm: usize,
  cStride: i32,
  rows: i32,
  columns: i32,
  depth: i32,
  t: f64,
  sign: f64,
): void {
  const strip = 2 * widthOf<V>();
  for (let j = 0; j < columns; j += TILE_COLUMNS) {
    const b = (<usize>(j * depth)) << 3;
    for (let i = 0; i < rows; i += strip) {
      const a = (<usize>(i * depth)) << 3;
      multiplyTile<V>(TILE, LEFT + a, RIGHT + b, depth);
      multiplyTile<V>(TILE_SECOND, LEFT_SECOND + a, RIGHT_SECOND + b, depth);
      multiplyTile<V>(TILE_THIRD, LEFT_THIRD + a, RIGHT_THIRD + b, depth);
      combineTiles<V>(sign, t);
      const at = (<usize>(i + j * cStride)) << 3;
      const tileRows = min(strip, rows - i);
      const tileColumns = min(TILE_COLUMNS, columns - j);
      subtractTile<V>(cRe + at, TILE_SECOND, cStride, tileRows, tileColumns);
      subtractTile<V>(cIm + at, TILE_THIRD, cStride, tileRows, tileColumns);
    }
  }
}

/** Real part into the second tile, imaginary part into the third; `sign` is that of the imaginary parts of op(A). */
function combineTiles<V>(sign: f64, t: f64): void {
  const s = splat<V>(sign);
  const st2 = splat<V>(sign * t * t);
  const inverse = splat<V>(1 / t);
  const bytes: usize = 2 * sizeof<V>() * <usize>TILE_COLUMNS;
  for (let p: usize = 0; p < bytes; p += sizeof<V>()) {
    const first = load<V>(TILE + p);
    const second = load<V>(TILE_SECOND + p);
    const both = subtract<V>(load<V>(TILE_THIRD + p), first);
    store<V>(TILE_SECOND + p, subtract<V>(first, multiply<V>(s, second)));
    store<V>(TILE_THIRD + p, multiply<V>(inverse, subtract<V>(both, multiply<V>(st2, second))));
  }
}
