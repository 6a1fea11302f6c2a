/**
 * Packing and the innermost loop shared by real and complex products: tiles of two vectors by
 * four or six columns, whose sums just fit the registers and hide the latency of one another.
 *
 * Source: Goto & van de Geijn, ACM TOMS 34(3), 2008.
 */

import { Lane } from "./lane";
import { copyPadded, multiplyAdd, splatAt, subtract, widthOf, zero } from "./lanes";
import { TILE_COLUMNS } from "./layout";

/** Bytes of one packed row of a group. */
const TILE_ROW: usize = (<usize>TILE_COLUMNS) << 3;

/** Strips of two vectors of rows, column by column, from `a` (rows×depth); missing rows are zero. */
export function packLeft(to: usize, a: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf();
  const half: usize = sizeof<Lane>();
  const step = (<usize>stride) << 3;
  for (let i = 0; i < rows; i += strip) {
    const left = rows - i;
    let from = a + ((<usize>i) << 3);
    for (let p = 0; p < depth; p++) {
      if (left >= strip) {
        store<Lane>(to, load<Lane>(from));
        store<Lane>(to + half, load<Lane>(from + half));
      } else copyPadded(to, from, left, strip);
      to += 2 * half;
      from += step;
    }
  }
}

/** The same for Aᵀ, whose rows are the columns of `a` (depth×rows). */
export function packLeftTransposed(to: usize, a: usize, stride: i32, rows: i32, depth: i32): void {
  const strip = 2 * widthOf();
  const half: usize = sizeof<Lane>();
  for (let i = 0; i < rows; i += strip) {
    for (let t = 0; t < strip; t++) {
      let at = to + ((<usize>(i * depth + t)) << 3);
      const column = a + ((<usize>((i + t) * stride)) << 3);
      const inside = i + t < rows;
      for (let p: usize = 0; p < (<usize>depth) << 3; p += 8, at += 2 * half) {
        store<f64>(at, inside ? load<f64>(column + p) : 0);
      }
    }
  }
}

/** Groups of as many columns as a tile has, row by row, from `b` (depth×columns); missing columns are zero. */
export function packRight(to: usize, b: usize, stride: i32, columns: i32, depth: i32): void {
  const step = (<usize>stride) << 3;
  const bytes = (<usize>depth) << 3;
  for (let j = 0; j < columns; j += TILE_COLUMNS) {
    const whole = columns - j >= TILE_COLUMNS;
    for (let p: usize = 0; p < bytes; p += 8, to += TILE_ROW) {
      if (whole) {
        store<f64>(to, load<f64>(b + p));
        store<f64>(to, load<f64>(b + step + p), 8);
        store<f64>(to, load<f64>(b + 2 * step + p), 16);
        store<f64>(to, load<f64>(b + 3 * step + p), 24);
        if (TILE_COLUMNS === 6) {
          store<f64>(to, load<f64>(b + 4 * step + p), 32);
          store<f64>(to, load<f64>(b + 5 * step + p), 40);
        }
      } else {
        for (let t = 0; t < TILE_COLUMNS; t++) {
          const inside = j + t < columns;
          store<f64>(to + ((<usize>t) << 3), inside ? load<f64>(b + <usize>t * step + p) : 0);
        }
      }
    }
    b += <usize>TILE_COLUMNS * step;
  }
}

/** The product of a packed strip and a packed group, column after column at `to`. */
export function multiplyTile(to: usize, a: usize, b: usize, depth: i32): void {
  const half: usize = sizeof<Lane>();
  let s00 = zero();
  let s10 = zero();
  let s01 = zero();
  let s11 = zero();
  let s02 = zero();
  let s12 = zero();
  let s03 = zero();
  let s13 = zero();
  let s04 = zero();
  let s14 = zero();
  let s05 = zero();
  let s15 = zero();
  const end = b + <usize>depth * TILE_ROW;
  for (; b < end; b += TILE_ROW, a += 2 * half) {
    const a0 = load<Lane>(a);
    const a1 = load<Lane>(a + half);
    const b0 = splatAt(b);
    s00 = multiplyAdd(a0, b0, s00);
    s10 = multiplyAdd(a1, b0, s10);
    const b1 = splatAt(b + 8);
    s01 = multiplyAdd(a0, b1, s01);
    s11 = multiplyAdd(a1, b1, s11);
    const b2 = splatAt(b + 16);
    s02 = multiplyAdd(a0, b2, s02);
    s12 = multiplyAdd(a1, b2, s12);
    const b3 = splatAt(b + 24);
    s03 = multiplyAdd(a0, b3, s03);
    s13 = multiplyAdd(a1, b3, s13);
    if (TILE_COLUMNS === 6) {
      const b4 = splatAt(b + 32);
      s04 = multiplyAdd(a0, b4, s04);
      s14 = multiplyAdd(a1, b4, s14);
      const b5 = splatAt(b + 40);
      s05 = multiplyAdd(a0, b5, s05);
      s15 = multiplyAdd(a1, b5, s15);
    }
  }
  store<Lane>(to, s00);
  store<Lane>(to + half, s10);
  store<Lane>(to + 2 * half, s01);
  store<Lane>(to + 3 * half, s11);
  store<Lane>(to + 4 * half, s02);
  store<Lane>(to + 5 * half, s12);
  store<Lane>(to + 6 * half, s03);
  store<Lane>(to + 7 * half, s13);
  if (TILE_COLUMNS === 6) {
    store<Lane>(to + 8 * half, s04);
    store<Lane>(to + 9 * half, s14);
    store<Lane>(to + 10 * half, s05);
    store<Lane>(to + 11 * half, s15);
  }
}

/** C ← C − the tile at `tile`, of which so many rows and columns exist. */
export function subtractTile(c: usize, tile: usize, cStride: i32, rows: i32, columns: i32): void {
  const half: usize = sizeof<Lane>();
  const step = (<usize>cStride) << 3;
  const whole = rows === 2 * widthOf();
  for (let j = 0; j < columns; j++) {
    if (whole) {
      store<Lane>(c, subtract(load<Lane>(c), load<Lane>(tile)));
      store<Lane>(c + half, subtract(load<Lane>(c + half), load<Lane>(tile + half)));
    } else {
      for (let i: usize = 0; i < (<usize>rows) << 3; i += 8) {
        store<f64>(c + i, load<f64>(c + i) - load<f64>(tile + i));
      }
    }
    tile += 2 * half;
    c += step;
  }
}
