/**
 * Dense real kernels on column-major blocks inside larger arrays; the real counterpart of
 * `complex-kernels.ts`, and likewise all that a compiled kernel has to replace.
 *
 * Source: Goto & van de Geijn, ACM TOMS 34(3), 2008 (packing and register blocks).
 */

/** A block of a matrix: array, index of the first entry, distance from one column to the next. */
export interface RealBlock {
  values: Float64Array;
  at: number;
  stride: number;
}

/** Rows of A packed at a time: with 48 columns they fill half of the first-level cache. */
const ROW_BLOCK = 64;

let packedA = new Float64Array(0);
let packedB = new Float64Array(0);

/**
 * C ← C − op(A) B with op(A) = A, or Aᵀ when `transposed`; op(A) m×k, B k×n, C m×n.
 * C must not overlap A or B.
 */
export function subtractRealProductInto(
  c: RealBlock,
  a: RealBlock,
  b: RealBlock,
  m: number,
  n: number,
  k: number,
  transposed: boolean,
): void {
  if (m <= 0 || n <= 0 || k <= 0) return;
  packRight(b, n, k);
  if (packedA.length < (ROW_BLOCK + 4) * k) packedA = new Float64Array((ROW_BLOCK + 4) * k);
  for (let i0 = 0; i0 < m; i0 += ROW_BLOCK) {
    const rows = Math.min(ROW_BLOCK, m - i0);
    if (transposed) packLeftTransposed(a, i0, rows, k);
    else packLeft(a, i0, rows, k);
    subtractPacked(c, i0, rows, n, k);
  }
}

/** Pairs of columns of B, row by row; an odd last column gets zeros. */
function packRight(b: RealBlock, n: number, k: number): void {
  const { values, at, stride } = b;
  const size = k * (n + (n & 1));
  if (packedB.length < size) packedB = new Float64Array(size);
  const packed = packedB;
  let q = 0;
  for (let j = 0; j < n; j += 2) {
    const first = at + j * stride;
    const paired = j + 1 < n;
    const second = paired ? first + stride : first;
    for (let p = 0; p < k; p++, q += 2) {
      packed[q] = values[first + p];
      packed[q + 1] = paired ? values[second + p] : 0;
    }
  }
}

/** Fours of rows of A, column by column; missing rows are zero. */
function packLeft(a: RealBlock, i0: number, rows: number, k: number): void {
  const { values, stride } = a;
  const packed = packedA;
  const whole = rows & ~3;
  for (let p = 0; p < k; p++) {
    const column = a.at + i0 + p * stride;
    let q = 4 * p;
    for (let i = 0; i < whole; i += 4, q += 4 * k) {
      packed[q] = values[column + i];
      packed[q + 1] = values[column + i + 1];
      packed[q + 2] = values[column + i + 2];
      packed[q + 3] = values[column + i + 3];
    }
    if (whole < rows)
      for (let t = 0; t < 4; t++) packed[q + t] = whole + t < rows ? values[column + whole + t] : 0;
  }
}

/** The same for Aᵀ, whose rows are the columns of A. */
function packLeftTransposed(a: RealBlock, i0: number, rows: number, k: number): void {
  const { values, stride } = a;
  const packed = packedA;
  for (let i = 0; i < rows + (-rows & 3); i++) {
    const column = a.at + (i0 + i) * stride;
    let q = (i & ~3) * k + (i & 3);
    for (let p = 0; p < k; p++, q += 4) packed[q] = i < rows ? values[column + p] : 0;
  }
}

// biome-ignore lint/complexity/noExcessiveCognitiveComplexity: one register-blocked loop nest with its edges
function subtractPacked(c: RealBlock, i0: number, rows: number, n: number, k: number): void {
  const { values, stride } = c;
  const pa = packedA;
  const pb = packedB;
  for (let j = 0; j < n; j += 2) {
    const bBegin = j * k;
    const paired = j + 1 < n;
    for (let i = 0; i < rows; i += 4) {
      let s00 = 0;
      let s10 = 0;
      let s20 = 0;
      let s30 = 0;
      let s01 = 0;
      let s11 = 0;
      let s21 = 0;
      let s31 = 0;
      let q = i * k;
      const end = q + 4 * k;
      for (let t = bBegin; q < end; q += 4, t += 2) {
        const b0 = pb[t];
        const b1 = pb[t + 1];
        const a0 = pa[q];
        s00 += a0 * b0;
        s01 += a0 * b1;
        const a1 = pa[q + 1];
        s10 += a1 * b0;
        s11 += a1 * b1;
        const a2 = pa[q + 2];
        s20 += a2 * b0;
        s21 += a2 * b1;
        const a3 = pa[q + 3];
        s30 += a3 * b0;
        s31 += a3 * b1;
      }
      const at = c.at + i0 + i + j * stride;
      const left = rows - i;
      values[at] -= s00;
      if (left > 1) values[at + 1] -= s10;
      if (left > 2) values[at + 2] -= s20;
      if (left > 3) values[at + 3] -= s30;
      if (paired) {
        values[at + stride] -= s01;
        if (left > 1) values[at + stride + 1] -= s11;
        if (left > 2) values[at + stride + 2] -= s21;
        if (left > 3) values[at + stride + 3] -= s31;
      }
    }
  }
}

/** y ← y − A x for few columns n of x and y, four columns of A at a time; A m×k. */
export function subtractThinRealProductInto(
  y: RealBlock,
  a: RealBlock,
  x: RealBlock,
  m: number,
  n: number,
  k: number,
): void {
  const { values: yv } = y;
  const { values: av, stride } = a;
  const { values: xv } = x;
  for (let c = 0; c < n; c++) {
    const yAt = y.at + c * y.stride;
    const xAt = x.at + c * x.stride;
    let p = 0;
    for (; p + 3 < k; p += 4) {
      const x0 = xv[xAt + p];
      const x1 = xv[xAt + p + 1];
      const x2 = xv[xAt + p + 2];
      const x3 = xv[xAt + p + 3];
      const a0 = a.at + p * stride;
      const a1 = a0 + stride;
      const a2 = a1 + stride;
      const a3 = a2 + stride;
      for (let i = 0; i < m; i++) {
        yv[yAt + i] -= av[a0 + i] * x0 + av[a1 + i] * x1 + (av[a2 + i] * x2 + av[a3 + i] * x3);
      }
    }
    for (; p < k; p++) {
      const x0 = xv[xAt + p];
      const a0 = a.at + p * stride;
      for (let i = 0; i < m; i++) yv[yAt + i] -= av[a0 + i] * x0;
    }
  }
}

/** y ← y − Aᵀ x for few columns n of x and y, four columns of A at a time; A k×m. */
export function subtractThinRealTransposedProductInto(
  y: RealBlock,
  a: RealBlock,
  x: RealBlock,
  m: number,
  n: number,
  k: number,
): void {
  const { values: yv } = y;
  const { values: av, stride } = a;
  const { values: xv } = x;
  for (let c = 0; c < n; c++) {
    const yAt = y.at + c * y.stride;
    const xAt = x.at + c * x.stride;
    let i = 0;
    for (; i + 3 < m; i += 4) {
      const a0 = a.at + i * stride;
      const a1 = a0 + stride;
      const a2 = a1 + stride;
      const a3 = a2 + stride;
      let s0 = 0;
      let s1 = 0;
      let s2 = 0;
      let s3 = 0;
      for (let p = 0; p < k; p++) {
        const xp = xv[xAt + p];
        s0 += av[a0 + p] * xp;
        s1 += av[a1 + p] * xp;
        s2 += av[a2 + p] * xp;
        s3 += av[a3 + p] * xp;
      }
      yv[yAt + i] -= s0;
      yv[yAt + i + 1] -= s1;
      yv[yAt + i + 2] -= s2;
      yv[yAt + i + 3] -= s3;
    }
    for (; i < m; i++) {
      const a0 = a.at + i * stride;
      let s0 = 0;
      for (let p = 0; p < k; p++) s0 += av[a0 + p] * xv[xAt + p];
      yv[yAt + i] -= s0;
    }
  }
}

/** X ← L⁻¹ X with L k×k unit lower triangular, X k×n. */
export function solveRealUnitLowerInPlace(l: RealBlock, x: RealBlock, n: number, k: number): void {
  const { values: lv, stride } = l;
  const { values: xv } = x;
  for (let c = 0; c < n; c++) {
    const xAt = x.at + c * x.stride;
    for (let p = 0; p < k - 1; p++) {
      const xp = xv[xAt + p];
      const column = l.at + p * stride;
      for (let i = p + 1; i < k; i++) xv[xAt + i] -= lv[column + i] * xp;
    }
  }
}

/** X ← L⁻ᵀ X with L k×k unit lower triangular, X k×n. */
export function solveRealUnitLowerTransposedInPlace(l: RealBlock, x: RealBlock, n: number, k: number): void {
  const { values: lv, stride } = l;
  const { values: xv } = x;
  for (let c = 0; c < n; c++) {
    const xAt = x.at + c * x.stride;
    for (let p = k - 2; p >= 0; p--) {
      const column = l.at + p * stride;
      let sum = xv[xAt + p];
      for (let i = p + 1; i < k; i++) sum -= lv[column + i] * xv[xAt + i];
      xv[xAt + p] = sum;
    }
  }
}
