/**
 * Products of blocks inside column-major arrays, on which the dense
 * factorisations stand. A block's entry (i, j) is `values[at + i + j * stride]`.
 */

/** A rectangle inside a real array; its size is told to the kernel. */
export interface Block {
  readonly values: Float64Array;
  readonly at: number;
  readonly stride: number;
}

/** A rectangle inside a pair of arrays of real and imaginary parts. */
export interface ComplexBlock {
  readonly re: Float64Array;
  readonly im: Float64Array;
  readonly at: number;
  readonly stride: number;
}

// A slab of this many rows of A stays in the second-level cache for widths to some 300.
const rowSlab = 128;
const depthSlab = 256;

/** C ← C + α A B with C m×n, A m×k, B k×n; C may share an array with A and B but not overlap them. */
export function addProductInto(
  c: Block,
  alpha: number,
  a: Block,
  b: Block,
  m: number,
  n: number,
  k: number,
): void {
  for (let top = 0; top < m; top += rowSlab) {
    const height = Math.min(rowSlab, m - top);
    let j = 0;
    for (; j + 1 < n; j += 2) {
      addColumnPair(
        c.values,
        c.at + top + j * c.stride,
        c.stride,
        alpha,
        a.values,
        a.at + top,
        a.stride,
        b.values,
        b.at + j * b.stride,
        b.stride,
        height,
        k,
      );
    }
    if (j < n) {
      addColumn(
        c.values,
        c.at + top + j * c.stride,
        alpha,
        a.values,
        a.at + top,
        a.stride,
        b.values,
        b.at + j * b.stride,
        1,
        height,
        k,
      );
    }
  }
}

// Two columns of C, four of A at a time: eight multiplications for six loads and two stores.
function addColumnPair(
  c: Float64Array,
  cAt: number,
  cStride: number,
  alpha: number,
  a: Float64Array,
  aAt: number,
  aStride: number,
  b: Float64Array,
  bAt: number,
  bStride: number,
  m: number,
  k: number,
): void {
  const dAt = cAt + cStride;
  let p = 0;
  for (; p + 3 < k; p += 4) {
    const b0 = alpha * b[bAt + p];
    const b1 = alpha * b[bAt + p + 1];
    const b2 = alpha * b[bAt + p + 2];
    const b3 = alpha * b[bAt + p + 3];
    const e0 = alpha * b[bAt + bStride + p];
    const e1 = alpha * b[bAt + bStride + p + 1];
    const e2 = alpha * b[bAt + bStride + p + 2];
    const e3 = alpha * b[bAt + bStride + p + 3];
    const a0 = aAt + p * aStride;
    const a1 = a0 + aStride;
    const a2 = a1 + aStride;
    const a3 = a2 + aStride;
    for (let i = 0; i < m; i++) {
      const x0 = a[a0 + i];
      const x1 = a[a1 + i];
      const x2 = a[a2 + i];
      const x3 = a[a3 + i];
      c[cAt + i] += x0 * b0 + x1 * b1 + (x2 * b2 + x3 * b3);
      c[dAt + i] += x0 * e0 + x1 * e1 + (x2 * e2 + x3 * e3);
    }
  }
  for (; p < k; p++) {
    const b0 = alpha * b[bAt + p];
    const e0 = alpha * b[bAt + bStride + p];
    const a0 = aAt + p * aStride;
    for (let i = 0; i < m; i++) {
      const x0 = a[a0 + i];
      c[cAt + i] += x0 * b0;
      c[dAt + i] += x0 * e0;
    }
  }
}

/** c ← c + α A b for one column c of length m; entry p of b stands at `b[bAt + p * bStep]`. */
export function addColumn(
  c: Float64Array,
  cAt: number,
  alpha: number,
  a: Float64Array,
  aAt: number,
  aStride: number,
  b: Float64Array,
  bAt: number,
  bStep: number,
  m: number,
  k: number,
): void {
  let p = 0;
  for (; p + 3 < k; p += 4) {
    const b0 = alpha * b[bAt + p * bStep];
    const b1 = alpha * b[bAt + (p + 1) * bStep];
    const b2 = alpha * b[bAt + (p + 2) * bStep];
    const b3 = alpha * b[bAt + (p + 3) * bStep];
    const a0 = aAt + p * aStride;
    const a1 = a0 + aStride;
    const a2 = a1 + aStride;
    const a3 = a2 + aStride;
    for (let i = 0; i < m; i++) {
      c[cAt + i] += a[a0 + i] * b0 + a[a1 + i] * b1 + (a[a2 + i] * b2 + a[a3 + i] * b3);
    }
  }
  for (; p < k; p++) {
    const b0 = alpha * b[bAt + p * bStep];
    const a0 = aAt + p * aStride;
    for (let i = 0; i < m; i++) c[cAt + i] += a[a0 + i] * b0;
  }
}

/**
 * C ← C + α Aᵀ B with C m×n, A k×m, B k×n. With `upperOnly` entries below
 * the diagonal may be left out (for A = B, whose product is symmetric).
 */
export function addTransposedProductInto(
  c: Block,
  alpha: number,
  a: Block,
  b: Block,
  m: number,
  n: number,
  k: number,
  upperOnly = false,
): void {
  for (let top = 0; top < k; top += depthSlab) {
    const depth = Math.min(depthSlab, k - top);
    let i = 0;
    for (; i + 3 < m; i += 4) {
      const first = upperOnly ? i : 0;
      const paired = n - ((n - first) & 1);
      for (let j = first; j < paired; j += 2) addDotsFourByTwo(c, alpha, a, b, i, j, top, depth);
      if (paired < n) addDots(c, alpha, a, b, i, i + 4, paired, top, depth);
    }
    for (let j = upperOnly ? i : 0; j < n; j++) addDots(c, alpha, a, b, i, m, j, top, depth);
  }
}

// Rows `first` to `end` − 1 of column j of C.
function addDots(
  c: Block,
  alpha: number,
  a: Block,
  b: Block,
  first: number,
  end: number,
  j: number,
  top: number,
  depth: number,
): void {
  const x = a.values;
  const y = b.values;
  const yAt = b.at + j * b.stride + top;
  for (let i = first; i < end; i++) {
    const xAt = a.at + i * a.stride + top;
    let even = 0;
    let odd = 0;
    let p = 0;
    for (; p + 1 < depth; p += 2) {
      even += x[xAt + p] * y[yAt + p];
      odd += x[xAt + p + 1] * y[yAt + p + 1];
    }
    if (p < depth) even += x[xAt + p] * y[yAt + p];
    c.values[c.at + i + j * c.stride] += alpha * (even + odd);
  }
}

function addDotsFourByTwo(
  c: Block,
  alpha: number,
  a: Block,
  b: Block,
  i: number,
  j: number,
  top: number,
  depth: number,
): void {
  const x = a.values;
  const y = b.values;
  const x0 = a.at + i * a.stride + top;
  const x1 = x0 + a.stride;
  const x2 = x1 + a.stride;
  const x3 = x2 + a.stride;
  const y0 = b.at + j * b.stride + top;
  const y1 = y0 + b.stride;
  let s00 = 0;
  let s10 = 0;
  let s20 = 0;
  let s30 = 0;
  let s01 = 0;
  let s11 = 0;
  let s21 = 0;
  let s31 = 0;
  for (let p = 0; p < depth; p++) {
    const u = y[y0 + p];
    const v = y[y1 + p];
    const w0 = x[x0 + p];
    s00 += w0 * u;
    s01 += w0 * v;
    const w1 = x[x1 + p];
    s10 += w1 * u;
    s11 += w1 * v;
    const w2 = x[x2 + p];
    s20 += w2 * u;
    s21 += w2 * v;
    const w3 = x[x3 + p];
    s30 += w3 * u;
    s31 += w3 * v;
  }
  const out = c.values;
  const c0 = c.at + i + j * c.stride;
  const c1 = c0 + c.stride;
  out[c0] += alpha * s00;
  out[c0 + 1] += alpha * s10;
  out[c0 + 2] += alpha * s20;
  out[c0 + 3] += alpha * s30;
  out[c1] += alpha * s01;
  out[c1 + 1] += alpha * s11;
  out[c1 + 2] += alpha * s21;
  out[c1 + 3] += alpha * s31;
}
