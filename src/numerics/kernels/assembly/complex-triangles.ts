/**
 * Solves with triangles of complex factors and products with few columns, in place, on
 * column-major blocks in split storage. Addresses are bytes, strides and sizes doubles.
 */

import { subtractComplexProduct } from "./complex-product";
import { Lane } from "./lane";
import { multiplyAdd, multiplySubtract, splat, sumOfLanes, widthOf, zero } from "./lanes";

/** Triangles up to this size are solved directly, larger ones in blocks. */
const BLOCK: i32 = 8;
/** From this many columns on, packing pays. */
const PACKED_FROM: i32 = 4;

/** y ← y − op(A) x: thin or packed, as the number n of columns asks for; op(A) is m×k. */
export function subtractComplex(
  yRe: usize,
  yIm: usize,
  yStride: i32,
  aRe: usize,
  aIm: usize,
  aStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  m: i32,
  n: i32,
  k: i32,
  adjoint: bool,
): void {
  if (n >= PACKED_FROM) {
    subtractComplexProduct(yRe, yIm, yStride, aRe, aIm, aStride, xRe, xIm, xStride, m, n, k, adjoint);
    return;
  }
  for (let c = 0; c < n; c++) {
    const y = (<usize>(c * yStride)) << 3;
    const x = (<usize>(c * xStride)) << 3;
    if (adjoint) subtractAdjointColumn(yRe + y, yIm + y, aRe, aIm, aStride, xRe + x, xIm + x, m, k);
    else subtractColumn(yRe + y, yIm + y, aRe, aIm, aStride, xRe + x, xIm + x, m, k);
  }
}

/** y ← y − A x for one column, two columns of A at a time. */
function subtractColumn(
  yRe: usize,
  yIm: usize,
  aRe: usize,
  aIm: usize,
  aStride: i32,
  xRe: usize,
  xIm: usize,
  m: i32,
  k: i32,
): void {
  const step = (<usize>aStride) << 3;
  let p = 0;
  for (; p + 1 < k; p += 2) {
    const at = (<usize>p) << 3;
    const column = (<usize>(p * aStride)) << 3;
    subtractTwo(
      yRe,
      yIm,
      aRe + column,
      aIm + column,
      step,
      load<f64>(xRe + at),
      load<f64>(xIm + at),
      load<f64>(xRe + at, 8),
      load<f64>(xIm + at, 8),
      m,
    );
  }
  if (p < k) {
    const at = (<usize>p) << 3;
    const column = (<usize>(p * aStride)) << 3;
    const xr = load<f64>(xRe + at);
    const xi = load<f64>(xIm + at);
    subtractOne(yRe, yIm, aRe + column, aIm + column, xr, xi, m);
  }
}

function subtractTwo(
  yRe: usize,
  yIm: usize,
  aRe: usize,
  aIm: usize,
  step: usize,
  x0r: f64,
  x0i: f64,
  x1r: f64,
  x1i: f64,
  m: i32,
): void {
  const width = widthOf();
  const v0r = splat(x0r);
  const v0i = splat(x0i);
  const v1r = splat(x1r);
  const v1i = splat(x1i);
  const bRe = aRe + step;
  const bIm = aIm + step;
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    const ar = load<Lane>(aRe + at);
    const ai = load<Lane>(aIm + at);
    const br = load<Lane>(bRe + at);
    const bi = load<Lane>(bIm + at);
    let r = multiplyAdd(ai, v0i, multiplySubtract(ar, v0r, load<Lane>(yRe + at)));
    let s = multiplySubtract(ai, v0r, multiplySubtract(ar, v0i, load<Lane>(yIm + at)));
    r = multiplyAdd(bi, v1i, multiplySubtract(br, v1r, r));
    s = multiplySubtract(bi, v1r, multiplySubtract(br, v1i, s));
    store<Lane>(yRe + at, r);
    store<Lane>(yIm + at, s);
  }
  for (; i < m; i++) {
    const at = (<usize>i) << 3;
    const ar = load<f64>(aRe + at);
    const ai = load<f64>(aIm + at);
    const br = load<f64>(bRe + at);
    const bi = load<f64>(bIm + at);
    store<f64>(yRe + at, load<f64>(yRe + at) - (ar * x0r - ai * x0i) - (br * x1r - bi * x1i));
    store<f64>(yIm + at, load<f64>(yIm + at) - (ar * x0i + ai * x0r) - (br * x1i + bi * x1r));
  }
}

/** y ← y − a x for a column a and a number x. */
export function subtractOne(yRe: usize, yIm: usize, aRe: usize, aIm: usize, xr: f64, xi: f64, m: i32): void {
  const width = widthOf();
  const vr = splat(xr);
  const vi = splat(xi);
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    const ar = load<Lane>(aRe + at);
    const ai = load<Lane>(aIm + at);
    store<Lane>(yRe + at, multiplyAdd(ai, vi, multiplySubtract(ar, vr, load<Lane>(yRe + at))));
    store<Lane>(yIm + at, multiplySubtract(ai, vr, multiplySubtract(ar, vi, load<Lane>(yIm + at))));
  }
  for (; i < m; i++) {
    const at = (<usize>i) << 3;
    const ar = load<f64>(aRe + at);
    const ai = load<f64>(aIm + at);
    store<f64>(yRe + at, load<f64>(yRe + at) - (ar * xr - ai * xi));
    store<f64>(yIm + at, load<f64>(yIm + at) - (ar * xi + ai * xr));
  }
}

/** y ← y − Aᴴ x for one column; A is k×m. */
function subtractAdjointColumn(
  yRe: usize,
  yIm: usize,
  aRe: usize,
  aIm: usize,
  aStride: i32,
  xRe: usize,
  xIm: usize,
  m: i32,
  k: i32,
): void {
  const width = widthOf();
  const step = (<usize>aStride) << 3;
  for (let i: usize = 0; i < (<usize>m) << 3; i += 8) {
    // Four sums, so that none waits for another.
    let rr = zero();
    let ii = zero();
    let ri = zero();
    let ir = zero();
    let p = 0;
    for (; p + width <= k; p += width) {
      const at = (<usize>p) << 3;
      const ar = load<Lane>(aRe + at);
      const ai = load<Lane>(aIm + at);
      const xr = load<Lane>(xRe + at);
      const xi = load<Lane>(xIm + at);
      rr = multiplyAdd(ar, xr, rr);
      ii = multiplyAdd(ai, xi, ii);
      ri = multiplyAdd(ar, xi, ri);
      ir = multiplyAdd(ai, xr, ir);
    }
    let sumRe = sumOfLanes(rr) + sumOfLanes(ii);
    let sumIm = sumOfLanes(ri) - sumOfLanes(ir);
    for (; p < k; p++) {
      const at = (<usize>p) << 3;
      const ar = load<f64>(aRe + at);
      const ai = load<f64>(aIm + at);
      const xr = load<f64>(xRe + at);
      const xi = load<f64>(xIm + at);
      sumRe += ar * xr + ai * xi;
      sumIm += ar * xi - ai * xr;
    }
    store<f64>(yRe + i, load<f64>(yRe + i) - sumRe);
    store<f64>(yIm + i, load<f64>(yIm + i) - sumIm);
    aRe += step;
    aIm += step;
  }
}

/** X ← L⁻¹ X with L k×k unit lower triangular, X k×n. */
export function solveComplexUnitLower(
  lRe: usize,
  lIm: usize,
  lStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  for (let begin = 0; begin < k; begin += BLOCK) {
    const size = min(BLOCK, k - begin);
    const diagonal = (<usize>(begin * (lStride + 1))) << 3;
    const rows = (<usize>begin) << 3;
    for (let c = 0; c < n; c++) {
      const x = rows + ((<usize>(c * xStride)) << 3);
      for (let p = 0; p + 1 < size; p++) {
        const at = x + ((<usize>p) << 3);
        const below = diagonal + ((<usize>(p * (lStride + 1) + 1)) << 3);
        const xr = load<f64>(xRe + at);
        const xi = load<f64>(xIm + at);
        subtractOne(xRe + at + 8, xIm + at + 8, lRe + below, lIm + below, xr, xi, size - p - 1);
      }
    }
    const next = (<usize>size) << 3;
    subtractComplex(
      xRe + rows + next,
      xIm + rows + next,
      xStride,
      lRe + diagonal + next,
      lIm + diagonal + next,
      lStride,
      xRe + rows,
      xIm + rows,
      xStride,
      k - begin - size,
      n,
      size,
      false,
    );
  }
}

/** X ← L⁻ᴴ X with L k×k unit lower triangular, X k×n. */
export function solveComplexUnitLowerAdjoint(
  lRe: usize,
  lIm: usize,
  lStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  for (let c = 0; c < n; c++) {
    const x = (<usize>(c * xStride)) << 3;
    for (let p = k - 2; p >= 0; p--) {
      const at = x + ((<usize>p) << 3);
      const below = (<usize>(p * (lStride + 1) + 1)) << 3;
      subtractAdjointColumn(
        xRe + at,
        xIm + at,
        lRe + below,
        lIm + below,
        0,
        xRe + at + 8,
        xIm + at + 8,
        1,
        k - p - 1,
      );
    }
  }
}

/** X ← U⁻¹ X with U k×k upper triangular, X k×n. */
export function solveComplexUpper(
  uRe: usize,
  uIm: usize,
  uStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  for (let p = k - 1; p >= 0; p--) {
    const column = (<usize>(p * uStride)) << 3;
    const pivot = column + ((<usize>p) << 3);
    const dr = load<f64>(uRe + pivot);
    const di = load<f64>(uIm + pivot);
    const d = 1 / (dr * dr + di * di);
    for (let c = 0; c < n; c++) {
      const x = (<usize>(c * xStride)) << 3;
      const at = x + ((<usize>p) << 3);
      const br = load<f64>(xRe + at);
      const bi = load<f64>(xIm + at);
      const xr = (br * dr + bi * di) * d;
      const xi = (bi * dr - br * di) * d;
      store<f64>(xRe + at, xr);
      store<f64>(xIm + at, xi);
      subtractOne(xRe + x, xIm + x, uRe + column, uIm + column, xr, xi, p);
    }
  }
}

/** X ← U⁻ᴴ X with U k×k upper triangular, X k×n. */
export function solveComplexUpperAdjoint(
  uRe: usize,
  uIm: usize,
  uStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  for (let p = 0; p < k; p++) {
    const column = (<usize>(p * uStride)) << 3;
    const pivot = column + ((<usize>p) << 3);
    const dr = load<f64>(uRe + pivot);
    const di = load<f64>(uIm + pivot);
    const d = 1 / (dr * dr + di * di);
    for (let c = 0; c < n; c++) {
      const x = (<usize>(c * xStride)) << 3;
      const at = x + ((<usize>p) << 3);
      subtractAdjointColumn(xRe + at, xIm + at, uRe + column, uIm + column, 0, xRe + x, xIm + x, 1, p);
      const br = load<f64>(xRe + at);
      const bi = load<f64>(xIm + at);
      // Division by the conjugate of the pivot.
      store<f64>(xRe + at, (br * dr - bi * di) * d);
      store<f64>(xIm + at, (bi * dr + br * di) * d);
    }
  }
}
