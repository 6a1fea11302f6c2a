/**
 * Solves with unit triangles of real factors and products with few columns, in place, on
 * column-major blocks. Addresses are bytes, strides and sizes doubles.
 */

import { Lane } from "./lane";
import { multiplyAdd, multiplySubtract, splat, sumOfLanes, widthOf, zero } from "./lanes";
import { subtractRealProduct } from "./real-product";

/** Triangles up to this size are solved directly, larger ones in blocks. */
const BLOCK: i32 = 8;
/** From this many columns on, packing pays. */
const PACKED_FROM: i32 = 4;

/** y ← y − op(A) x: thin or packed, as the number n of columns asks for; op(A) is m×k. */
export function subtractReal(
  y: usize,
  yStride: i32,
  a: usize,
  aStride: i32,
  x: usize,
  xStride: i32,
  m: i32,
  n: i32,
  k: i32,
  transposed: bool,
): void {
  if (n >= PACKED_FROM) {
    subtractRealProduct(y, yStride, a, aStride, x, xStride, m, n, k, transposed);
    return;
  }
  for (let c = 0; c < n; c++) {
    const yc = y + ((<usize>(c * yStride)) << 3);
    const xc = x + ((<usize>(c * xStride)) << 3);
    if (transposed) subtractTransposedColumn(yc, a, aStride, xc, m, k);
    else subtractColumn(yc, a, aStride, xc, m, k);
  }
}

/** y ← y − A x for one column, four columns of A at a time. */
function subtractColumn(y: usize, a: usize, aStride: i32, x: usize, m: i32, k: i32): void {
  const step = (<usize>aStride) << 3;
  let p = 0;
  for (; p + 3 < k; p += 4) {
    subtractFour(y, a, step, x, m);
    a += 4 * step;
    x += 32;
  }
  for (; p < k; p++) {
    subtractOne(y, a, load<f64>(x), m);
    a += step;
    x += 8;
  }
}

function subtractFour(y: usize, a: usize, step: usize, x: usize, m: i32): void {
  const width = widthOf();
  const x0 = load<f64>(x);
  const x1 = load<f64>(x, 8);
  const x2 = load<f64>(x, 16);
  const x3 = load<f64>(x, 24);
  const v0 = splat(x0);
  const v1 = splat(x1);
  const v2 = splat(x2);
  const v3 = splat(x3);
  const b = a + step;
  const c = b + step;
  const d = c + step;
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    let sum = multiplySubtract(load<Lane>(a + at), v0, load<Lane>(y + at));
    sum = multiplySubtract(load<Lane>(b + at), v1, sum);
    sum = multiplySubtract(load<Lane>(c + at), v2, sum);
    store<Lane>(y + at, multiplySubtract(load<Lane>(d + at), v3, sum));
  }
  for (; i < m; i++) {
    const at = (<usize>i) << 3;
    const sum =
      load<f64>(a + at) * x0 + load<f64>(b + at) * x1 + load<f64>(c + at) * x2 + load<f64>(d + at) * x3;
    store<f64>(y + at, load<f64>(y + at) - sum);
  }
}

/** y ← y − a x for a column a and a number x. */
export function subtractOne(y: usize, a: usize, x: f64, m: i32): void {
  const width = widthOf();
  const v = splat(x);
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    store<Lane>(y + at, multiplySubtract(load<Lane>(a + at), v, load<Lane>(y + at)));
  }
  for (; i < m; i++) {
    const at = (<usize>i) << 3;
    store<f64>(y + at, load<f64>(y + at) - load<f64>(a + at) * x);
  }
}

/** y ← y − Aᵀ x for one column; A is k×m. */
function subtractTransposedColumn(y: usize, a: usize, aStride: i32, x: usize, m: i32, k: i32): void {
  const width = widthOf();
  const step = (<usize>aStride) << 3;
  for (let i = 0; i < m; i++) {
    // Two sums, so that neither waits for the other.
    let even = zero();
    let odd = zero();
    let p = 0;
    for (; p + 2 * width <= k; p += 2 * width) {
      const at = (<usize>p) << 3;
      even = multiplyAdd(load<Lane>(a + at), load<Lane>(x + at), even);
      odd = multiplyAdd(load<Lane>(a + at + sizeof<Lane>()), load<Lane>(x + at + sizeof<Lane>()), odd);
    }
    let sum = sumOfLanes(even) + sumOfLanes(odd);
    for (; p < k; p++) {
      const at = (<usize>p) << 3;
      sum += load<f64>(a + at) * load<f64>(x + at);
    }
    store<f64>(y, load<f64>(y) - sum);
    y += 8;
    a += step;
  }
}

/** X ← L⁻¹ X with L k×k unit lower triangular, X k×n. */
export function solveRealUnitLower(l: usize, lStride: i32, x: usize, xStride: i32, n: i32, k: i32): void {
  for (let begin = 0; begin < k; begin += BLOCK) {
    const size = min(BLOCK, k - begin);
    const diagonal = l + ((<usize>(begin * (lStride + 1))) << 3);
    const rows = x + ((<usize>begin) << 3);
    for (let c = 0; c < n; c++) {
      const column = rows + ((<usize>(c * xStride)) << 3);
      for (let p = 0; p + 1 < size; p++) {
        const at = column + ((<usize>p) << 3);
        subtractOne(at + 8, diagonal + ((<usize>(p * (lStride + 1) + 1)) << 3), load<f64>(at), size - p - 1);
      }
    }
    const next = (<usize>size) << 3;
    subtractReal(
      rows + next,
      xStride,
      diagonal + next,
      lStride,
      rows,
      xStride,
      k - begin - size,
      n,
      size,
      false,
    );
  }
}

/** X ← L⁻ᵀ X with L k×k unit lower triangular, X k×n. */
export function solveRealUnitLowerTransposed(
  l: usize,
  lStride: i32,
  x: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  for (let c = 0; c < n; c++) {
    const column = x + ((<usize>(c * xStride)) << 3);
    for (let p = k - 2; p >= 0; p--) {
      const at = column + ((<usize>p) << 3);
      subtractTransposedColumn(at, l + ((<usize>(p * (lStride + 1) + 1)) << 3), 0, at + 8, 1, k - p - 1);
    }
  }
}
