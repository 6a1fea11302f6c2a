/** Products handed to a library of the machine, where one has been connected. */

import { subtractComplexProduct } from "./complex-product";
import { subtractRealProduct } from "./real-product";

/** C ← C − A B outside; the arguments are those of the products here. */
declare function complexProductOutside(
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
): void;

declare function realProductOutside(
  c: usize,
  cStride: i32,
  a: usize,
  aStride: i32,
  b: usize,
  bStride: i32,
  m: i32,
  n: i32,
  k: i32,
): void;

/** Products with at least so many rows and columns go outside; 0: none. */
let outsideFrom: i32 = 0;

export function setOutsideFrom(size: i32): void {
  outsideFrom = size;
}

function goesOutside(m: i32, n: i32): bool {
  return outsideFrom > 0 && m >= outsideFrom && n >= outsideFrom;
}

export function subtractLargeComplexProduct(
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
): void {
  if (goesOutside(m, n)) {
    complexProductOutside(cRe, cIm, cStride, aRe, aIm, aStride, bRe, bIm, bStride, m, n, k);
  } else {
    subtractComplexProduct(cRe, cIm, cStride, aRe, aIm, aStride, bRe, bIm, bStride, m, n, k, false);
  }
}

export function subtractLargeRealProduct(
  c: usize,
  cStride: i32,
  a: usize,
  aStride: i32,
  b: usize,
  bStride: i32,
  m: i32,
  n: i32,
  k: i32,
): void {
  if (goesOutside(m, n)) realProductOutside(c, cStride, a, aStride, b, bStride, m, n, k);
  else subtractRealProduct(c, cStride, a, aStride, b, bStride, m, n, k, false);
}
