/**
 * C ← C − op(A) B for complex column-major blocks in split storage, by packed panels and a
 * register block of 2·width × 2. Addresses are bytes, strides and sizes are counted in doubles.
 *
 * Source: Goto & van de Geijn, ACM TOMS 34(3), 2008.
 */

import { copyPadded, multiplyAdd, multiplySubtract, splatAt, subtractLanes, widthOf, zero } from "./lanes";
import { PACKED_LEFT, PACKED_RIGHT } from "./layout";

/** Depth, columns and rows packed at a time: 64 rows fill the first-level cache, the columns the second. */
const DEPTH: i32 = 64;
const COLUMNS: i32 = 512;
const ROWS: i32 = 64;

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
      packRight(bRe + right, bIm + right, bStride, columns, depth);
      for (let i0 = 0; i0 < m; i0 += ROWS) {
        const rows = min(ROWS, m - i0);
        if (adjoint) {
          const left = (<usize>(p0 + i0 * aStride)) << 3;
          packLeftAdjoint<V>(aRe + left, aIm + left, aStride, rows, depth);
        } else {
          const left = (<usize>(i0 + p0 * aStride)) << 3;
          packLeft<V>(aRe + left, aIm + left, aStride, rows, depth);
        }
        const target = (<usize>(i0 + j0 * cStride)) << 3;
        subtractPacked<V>(cRe + target, cIm + target, cStride, rows, columns, depth);
      }
    }
  }
}

/** Pairs of columns, row by row: re, im of the one, re, im of the other; an odd last column gets zeros. */
function packRight(re: usize, im: usize, stride: i32, columns: i32, depth: i32): void {
  let to = PACKED_RIGHT;
  const step = (<usize>stride) << 3;
  for (let j = 0; j < columns; j += 2) {
    const paired = j + 1 < columns;
    for (let p: usize = 0; p < (<usize>depth) << 3; p += 8, to += 32) {
      store<f64>(to, load<f64>(re + p));
      store<f64>(to, load<f64>(im + p), 8);
      store<f64>(to, paired ? load<f64>(re + step + p) : 0, 16);
      store<f64>(to, paired ? load<f64>(im + step + p) : 0, 24);
    }
    re += step << 1;
    im += step << 1;
  }
}

/** Strips of 2·width rows, column by column: their real parts, then their imaginary parts; missing rows are zero. */
function packLeft<V>(re: usize, im: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  const step = (<usize>stride) << 3;
  let to = PACKED_LEFT;
  for (let i = 0; i < rows; i += strip) {
    const left = rows - i;
    let r = re + ((<usize>i) << 3);
    let s = im + ((<usize>i) << 3);
    for (let p = 0; p < depth; p++) {
      if (left >= strip) {
        store<V>(to, load<V>(r));
        store<V>(to + half, load<V>(r + half));
        store<V>(to + 2 * half, load<V>(s));
        store<V>(to + 3 * half, load<V>(s + half));
      } else {
        copyPadded(to, r, left, strip);
        copyPadded(to + 2 * half, s, left, strip);
      }
      to += 4 * half;
      r += step;
      s += step;
    }
  }
}

/** The same for Aᴴ, whose rows are the conjugated columns of A. */
function packLeftAdjoint<V>(re: usize, im: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  for (let i = 0; i < rows; i += strip) {
    for (let t = 0; t < strip; t++) {
      let to = PACKED_LEFT + ((<usize>(2 * i * depth + t)) << 3);
      const column = (<usize>((i + t) * stride)) << 3;
      const inside = i + t < rows;
      for (let p: usize = 0; p < (<usize>depth) << 3; p += 8, to += 4 * half) {
        store<f64>(to, inside ? load<f64>(re + column + p) : 0);
        store<f64>(to + 2 * half, inside ? -load<f64>(im + column + p) : 0);
      }
    }
  }
}

function subtractPacked<V>(cRe: usize, cIm: usize, cStride: i32, rows: i32, columns: i32, depth: i32): void {
  const strip = 2 * widthOf<V>();
  const half: usize = sizeof<V>();
  const step = (<usize>cStride) << 3;
  for (let j = 0; j < columns; j += 2) {
    const paired = j + 1 < columns;
    const bBegin = PACKED_RIGHT + ((<usize>(j * depth)) << 4);
    const bEnd = bBegin + ((<usize>depth) << 5);
    let a = PACKED_LEFT;
    for (let i = 0; i < rows; i += strip) {
      let r00 = zero<V>();
      let r10 = zero<V>();
      let i00 = zero<V>();
      let i10 = zero<V>();
      let r01 = zero<V>();
      let r11 = zero<V>();
      let i01 = zero<V>();
      let i11 = zero<V>();
      for (let b = bBegin; b < bEnd; b += 32, a += 4 * half) {
        const ar0 = load<V>(a);
        const ar1 = load<V>(a + half);
        const ai0 = load<V>(a + 2 * half);
        const ai1 = load<V>(a + 3 * half);
        const br = splatAt<V>(b);
        r00 = multiplyAdd<V>(ar0, br, r00);
        r10 = multiplyAdd<V>(ar1, br, r10);
        i00 = multiplyAdd<V>(ai0, br, i00);
        i10 = multiplyAdd<V>(ai1, br, i10);
        const bi = splatAt<V>(b + 8);
        r00 = multiplySubtract<V>(ai0, bi, r00);
        r10 = multiplySubtract<V>(ai1, bi, r10);
        i00 = multiplyAdd<V>(ar0, bi, i00);
        i10 = multiplyAdd<V>(ar1, bi, i10);
        const dr = splatAt<V>(b + 16);
        r01 = multiplyAdd<V>(ar0, dr, r01);
        r11 = multiplyAdd<V>(ar1, dr, r11);
        i01 = multiplyAdd<V>(ai0, dr, i01);
        i11 = multiplyAdd<V>(ai1, dr, i11);
        const di = splatAt<V>(b + 24);
        r01 = multiplySubtract<V>(ai0, di, r01);
        r11 = multiplySubtract<V>(ai1, di, r11);
        i01 = multiplyAdd<V>(ar0, di, i01);
        i11 = multiplyAdd<V>(ar1, di, i11);
      }
      const at = (<usize>i) << 3;
      const left = rows - i;
      subtractLanes<V>(cRe + at, r00, r10, left);
      subtractLanes<V>(cIm + at, i00, i10, left);
      if (paired) {
        subtractLanes<V>(cRe + step + at, r01, r11, left);
        subtractLanes<V>(cIm + step + at, i01, i11, left);
      }
    }
    cRe += step << 1;
    cIm += step << 1;
  }
}
