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

import { Lane } from "./lane";
import {
  larger,
  largestLane,
  magnitude,
  multiply,
  multiplyAdd,
  multiplySubtract,
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
export function subtractComplexProduct(
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
      const t = balance(RIGHT, RIGHT_SECOND, roundUp(columns, TILE_COLUMNS) * depth);
      addScaled(RIGHT_THIRD, RIGHT, RIGHT_SECOND, t, roundUp(columns, TILE_COLUMNS) * depth);
      for (let i0 = 0; i0 < m; i0 += ROWS) {
        const rows = min(ROWS, m - i0);
        const left = (<usize>(adjoint ? p0 + i0 * aStride : i0 + p0 * aStride)) << 3;
        if (adjoint) {
          packLeftTransposed(LEFT, aRe + left, aStride, rows, depth);
          packLeftTransposed(LEFT_SECOND, aIm + left, aStride, rows, depth);
        } else {
          packLeft(LEFT, aRe + left, aStride, rows, depth);
          packLeft(LEFT_SECOND, aIm + left, aStride, rows, depth);
        }
        const sign: f64 = adjoint ? -1 : 1;
        addScaled(LEFT_THIRD, LEFT, LEFT_SECOND, sign * t, roundUp(rows, 2 * widthOf()) * depth);
        const target = (<usize>(i0 + j0 * cStride)) << 3;
        subtractPacked(cRe + target, cIm + target, cStride, rows, columns, depth, t, sign);
      }
    }
  }
}

function roundUp(size: i32, unit: i32): i32 {
  return ((size + unit - 1) / unit) * unit;
}

/** The power of two that makes the largest imaginary part about as large as the largest real one. */
function balance(re: usize, im: usize, count: i32): f64 {
  let x = zero();
  let y = zero();
  const end = re + ((<usize>count) << 3);
  for (; re < end; re += sizeof<Lane>(), im += sizeof<Lane>()) {
    x = larger(x, magnitude(load<Lane>(re)));
    y = larger(y, magnitude(load<Lane>(im)));
  }
  const real = largestLane(x);
  const imaginary = largestLane(y);
  if (!(real > 0) || !(imaginary > 0)) return 1;
  // The exponents of two doubles differ by those of their quotient, give or take one.
  const shift = <i32>(reinterpret<i64>(real) >> 52) - <i32>(reinterpret<i64>(imaginary) >> 52);
  return reinterpret<f64>((<i64>(1023 + max(-40, min(40, shift)))) << 52);
}

/** to ← x + t y. */
function addScaled(to: usize, x: usize, y: usize, t: f64, count: i32): void {
  const v = splat(t);
  const end = x + ((<usize>count) << 3);
  for (; x < end; x += sizeof<Lane>(), y += sizeof<Lane>(), to += sizeof<Lane>()) {
    store<Lane>(to, multiplyAdd(load<Lane>(y), v, load<Lane>(x)));
  }
}

function subtractPacked(
  cRe: usize,
  cIm: usize,
  cStride: i32,
  rows: i32,
  columns: i32,
  depth: i32,
  t: f64,
  sign: f64,
): void {
  const strip = 2 * widthOf();
  for (let j = 0; j < columns; j += TILE_COLUMNS) {
    const b = (<usize>(j * depth)) << 3;
    for (let i = 0; i < rows; i += strip) {
      const a = (<usize>(i * depth)) << 3;
      multiplyTile(TILE, LEFT + a, RIGHT + b, depth);
      multiplyTile(TILE_SECOND, LEFT_SECOND + a, RIGHT_SECOND + b, depth);
      multiplyTile(TILE_THIRD, LEFT_THIRD + a, RIGHT_THIRD + b, depth);
      const at = (<usize>(i + j * cStride)) << 3;
      const tileRows = min(strip, rows - i);
      const tileColumns = min(TILE_COLUMNS, columns - j);
      if (tileRows === strip) {
        subtractCombined(cRe + at, cIm + at, cStride, tileColumns, sign, t);
      } else {
        combineTiles(sign, t);
        subtractTile(cRe + at, TILE_SECOND, cStride, tileRows, tileColumns);
        subtractTile(cIm + at, TILE_THIRD, cStride, tileRows, tileColumns);
      }
    }
  }
}

/** C ← C − the product that the three tiles make, in whole rows; `sign` is that of the imaginary parts of op(A). */
function subtractCombined(cRe: usize, cIm: usize, cStride: i32, columns: i32, sign: f64, t: f64): void {
  const s = splat(sign);
  const st2 = splat(sign * t * t);
  const inverse = splat(1 / t);
  const step = (<usize>cStride) << 3;
  const bytes: usize = 2 * sizeof<Lane>();
  let tile: usize = 0;
  for (let j = 0; j < columns; j++) {
    for (let p: usize = 0; p < bytes; p += sizeof<Lane>(), tile += sizeof<Lane>()) {
      const first = load<Lane>(TILE + tile);
      const second = load<Lane>(TILE_SECOND + tile);
      const both = subtract(load<Lane>(TILE_THIRD + tile), first);
      const real = multiplySubtract(s, second, first);
      const imaginary = multiplySubtract(st2, second, both);
      store<Lane>(cRe + p, subtract(load<Lane>(cRe + p), real));
      store<Lane>(cIm + p, multiplySubtract(inverse, imaginary, load<Lane>(cIm + p)));
    }
    cRe += step;
    cIm += step;
  }
}

/** Real part into the second tile, imaginary part into the third; `sign` is that of the imaginary parts of op(A). */
function combineTiles(sign: f64, t: f64): void {
  const s = splat(sign);
  const st2 = splat(sign * t * t);
  const inverse = splat(1 / t);
  const bytes: usize = 2 * sizeof<Lane>() * <usize>TILE_COLUMNS;
  for (let p: usize = 0; p < bytes; p += sizeof<Lane>()) {
    const first = load<Lane>(TILE + p);
    const second = load<Lane>(TILE_SECOND + p);
    const both = subtract(load<Lane>(TILE_THIRD + p), first);
    store<Lane>(TILE_SECOND + p, subtract(first, multiply(s, second)));
    store<Lane>(TILE_THIRD + p, multiply(inverse, subtract(both, multiply(st2, second))));
  }
}
