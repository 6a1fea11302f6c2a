/**
 * Solves with triangles of complex factors and products with few columns, in place, on
 * column-major blocks in split storage. Addresses are bytes, strides and sizes doubles.
 */

import { subtractComplexProduct } from "./complex-product";
import { multiplyAdd, multiplySubtract, splat, sumOfLanes, widthOf, zero } from "./lanes";

/** Triangles up to this size are solved directly, larger ones in blocks. */
const BLOCK: i32 = 8;
/** From this many columns on, packing pays. */
const PACKED_FROM: i32 = 4;

/** y ← y − op(A) x: thin or packed, as the number n of columns asks for; op(A) is m×k. */
export function subtractComplex<V>(
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
    subtractComplexProduct<V>(yRe, yIm, yStride, aRe, aIm, aStride, xRe, xIm, xStride, m, n, k, adjoint);
    return;
  }
  for (let c = 0; c < n; c++) {
    const y = (<usize>(c * yStride)) << 3;
    const x = (<usize>(c * xStride)) << 3;
    if (adjoint) subtractAdjointColumn<V>(yRe + y, yIm + y, aRe, aIm, aStride, xRe + x, xIm + x, m, k);
    else subtractColumn<V>(yRe + y, yIm + y, aRe, aIm, aStride, xRe + x, xIm + x, m, k);
  }
}

/** y ← y − A x for one column, two columns of A at a time. */
function subtractColumn<V>(
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
    subtractTwo<V>(
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
    subtractOne<V>(yRe, yIm, aRe + column, aIm + column, xr, xi, m);
  }
}

function subtractTwo<V>(
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
  const width = widthOf<V>();
  const v0r = splat<V>(x0r);
  const v0i = splat<V>(x0i);
  const v1r = splat<V>(x1r);
  const v1i = splat<V>(x1i);
  const bRe = aRe + step;
  const bIm = aIm + step;
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    const ar = load<V>(aRe + at);
    const ai = load<V>(aIm + at);
    const br = load<V>(bRe + at);
    const bi = load<V>(bIm + at);
    let r = multiplyAdd<V>(ai, v0i, multiplySubtract<V>(ar, v0r, load<V>(yRe + at)));
    let s = multiplySubtract<V>(ai, v0r, multiplySubtract<V>(ar, v0i, load<V>(yIm + at)));
    r = multiplyAdd<V>(bi, v1i, multiplySubtract<V>(br, v1r, r));
    s = multiplySubtract<V>(bi, v1r, multiplySubtract<V>(br, v1i, s));
    store<V>(yRe + at, r);
    store<V>(yIm + at, s);
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
function subtractOne<V>(yRe: usize, yIm: usize, aRe: usize, aIm: usize, xr: f64, xi: f64, m: i32): void {
  const width = widthOf<V>();
  const vr = splat<V>(xr);
  const vi = splat<V>(xi);
  let i = 0;
  for (; i + width <= m; i += width) {
    const at = (<usize>i) << 3;
    const ar = load<V>(aRe + at);
    const ai = load<V>(aIm + at);
    store<V>(yRe + at, multiplyAdd<V>(ai, vi, multiplySubtract<V>(ar, vr, load<V>(yRe + at))));
    store<V>(yIm + at, multiplySubtract<V>(ai, vr, multiplySubtract<V>(ar, vi, load<V>(yIm + at))));
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
function subtractAdjointColumn<V>(
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
  const width = widthOf<V>();
  const step = (<usize>aStride) << 3;
  for (let i: usize = 0; i < (<usize>m) << 3; i += 8) {
    // Four sums, so that none waits for another.
    let rr = zero<V>();
    let ii = zero<V>();
    let ri = zero<V>();
    let ir = zero<V>();
    let p = 0;
    for (; p + width <= k; p += width) {
      const at = (<usize>p) << 3;
      const ar = load<V>(aRe + at);
      const ai = load<V>(aIm + at);
      const xr = load<V>(xRe + at);
      const xi = load<V>(xIm + at);
      rr = multiplyAdd<V>(ar, xr, rr);
      ii = multiplyAdd<V>(ai, xi, ii);
      ri = multiplyAdd<V>(ar, xi, ri);
      ir = multiplyAdd<V>(ai, xr, ir);
    }
    let sumRe = sumOfLanes<V>(rr) + sumOfLanes<V>(ii);
    let sumIm = sumOfLanes<V>(ri) - sumOfLanes<V>(ir);
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
export function solveComplexUnitLower<V>(
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
        subtractOne<V>(xRe + at + 8, xIm + at + 8, lRe + below, lIm + below, xr, xi, size - p - 1);
      }
    }
    const next = (<usize>size) << 3;
    subtractComplex<V>(
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
export function solveComplexUnitLowerAdjoint<V>(
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
      subtractAdjointColumn<V>(
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
export function solveComplexUpper<V>(
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
      subtractOne<V>(xRe + x, xIm + x, uRe + column, uIm + column, xr, xi, p);
    }
  }
}

/** X ← U⁻ᴴ X with U k×k upper triangular, X k×n. */
export function solveComplexUpperAdjoint<V>(
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
      subtractAdjointColumn<V>(xRe + at, xIm + at, uRe + column, uIm + column, 0, xRe + x, xIm + x, 1, p);
      const br = load<f64>(xRe + at);
      const bi = load<f64>(xIm + at);
      // Division by the conjugate of the pivot.
      store<f64>(xRe + at, (br * dr - bi * di) * d);
      store<f64>(xIm + at, (bi * dr + br * di) * d);
    }
  }
}
