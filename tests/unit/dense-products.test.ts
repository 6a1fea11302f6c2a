import { expect, it } from "vitest";
import {
  type ComplexMatrix,
  complexZeros,
  type DenseMatrix,
  zeros,
} from "../../src/numerics/dense/matrix.js";
import {
  complexMultiply,
  complexMultiplyAdjoint,
  multiply,
  multiplyTransposed,
} from "../../src/numerics/dense/products.js";
import { createRandom } from "../../src/numerics/random.js";

const random = createRandom(1);

function randomMatrix(rows: number, cols: number): DenseMatrix {
  const a = zeros(rows, cols);
  for (let i = 0; i < a.values.length; i++) a.values[i] = random.normal();
  return a;
}

function randomComplex(rows: number, cols: number): ComplexMatrix {
  return { rows, cols, re: randomMatrix(rows, cols).values, im: randomMatrix(rows, cols).values };
}

function transposed(a: DenseMatrix): DenseMatrix {
  const t = zeros(a.cols, a.rows);
  for (let j = 0; j < a.cols; j++)
    for (let i = 0; i < a.rows; i++) t.values[j + i * t.rows] = a.values[i + j * a.rows];
  return t;
}

function naive(a: DenseMatrix, b: DenseMatrix): DenseMatrix {
  const c = zeros(a.rows, b.cols);
  for (let i = 0; i < a.rows; i++)
    for (let j = 0; j < b.cols; j++)
      for (let k = 0; k < a.cols; k++)
        c.values[i + j * c.rows] += a.values[i + k * a.rows] * b.values[k + j * b.rows];
  return c;
}

function combined(a: DenseMatrix, sign: number, b: DenseMatrix): DenseMatrix {
  return { rows: a.rows, cols: a.cols, values: a.values.map((x, i) => x + sign * b.values[i]) };
}

const re = (a: ComplexMatrix): DenseMatrix => ({ rows: a.rows, cols: a.cols, values: a.re });
const im = (a: ComplexMatrix): DenseMatrix => ({ rows: a.rows, cols: a.cols, values: a.im });

function difference(a: Float64Array, b: Float64Array): number {
  expect(a.length).toBe(b.length);
  return a.reduce((most, x, i) => Math.max(most, Math.abs(x - b[i])), 0);
}

// A sum of k ≤ 600 products of normal numbers rounds to below 600 · 2e-16 · 20.
const tolerance = 3e-12;
// Every remainder of the unrolled loops, the empty sizes, and several slabs.
const shapes = [
  [0, 0, 0],
  [0, 3, 2],
  [3, 0, 2],
  [1, 1, 1],
  [2, 3, 5],
  [5, 4, 7],
  [9, 7, 6],
  [8, 8, 8],
  [131, 13, 11],
  [10, 600, 9],
] as const;

it.each(shapes)("real products of %i×%i by %i columns agree with the defining sum", (m, k, n) => {
  const a = randomMatrix(m, k);
  const b = randomMatrix(k, n);
  const expected = naive(a, b).values;
  expect(difference(multiply(a, b).values, expected)).toBeLessThan(tolerance);
  expect(difference(multiplyTransposed(transposed(a), b).values, expected)).toBeLessThan(tolerance);
});

it.each(shapes)("complex products of %i×%i by %i columns agree with four real ones", (m, k, n) => {
  const a = randomComplex(m, k);
  const b = randomComplex(k, n);
  const product = complexMultiply(a, b);
  const expectedRe = combined(naive(re(a), re(b)), -1, naive(im(a), im(b))).values;
  const expectedIm = combined(naive(re(a), im(b)), 1, naive(im(a), re(b))).values;
  expect(difference(product.re, expectedRe)).toBeLessThan(tolerance);
  expect(difference(product.im, expectedIm)).toBeLessThan(tolerance);

  const adjoint = complexZeros(k, m);
  adjoint.re.set(transposed(re(a)).values);
  adjoint.im.set(transposed(im(a)).values.map((x) => -x));
  const again = complexMultiplyAdjoint(adjoint, b);
  expect(difference(again.re, expectedRe)).toBeLessThan(tolerance);
  expect(difference(again.im, expectedIm)).toBeLessThan(tolerance);
});

it("a Gram matrix comes out exactly symmetric and right", () => {
  const a = randomMatrix(300, 11);
  const gram = multiplyTransposed(a, a);
  expect(difference(gram.values, transposed(gram).values)).toBe(0);
  expect(difference(gram.values, naive(transposed(a), a).values)).toBeLessThan(tolerance);
});

it("products refuse sizes that do not fit", () => {
  expect(() => multiply(zeros(2, 3), zeros(2, 3))).toThrow("invariant");
  expect(() => multiplyTransposed(zeros(2, 3), zeros(3, 3))).toThrow("invariant");
});
