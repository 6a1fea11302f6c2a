import { expect, it } from "vitest";
import {
  cholesky,
  solveLowerInPlace,
  solveLowerTransposedInPlace,
} from "../../src/numerics/dense/cholesky.js";
import { factorDense, factorDenseComplex } from "../../src/numerics/dense/lu.js";
import { type ComplexMatrix, type DenseMatrix, zeros } from "../../src/numerics/dense/matrix.js";
import {
  complexMultiply,
  complexMultiplyAdjoint,
  multiply,
  multiplyTransposed,
} from "../../src/numerics/dense/products.js";
import { createRandom } from "../../src/numerics/random.js";

const random = createRandom(2);

function randomMatrix(rows: number, cols: number): DenseMatrix {
  const a = zeros(rows, cols);
  for (let i = 0; i < a.values.length; i++) a.values[i] = random.normal();
  return a;
}

function randomComplex(rows: number, cols: number): ComplexMatrix {
  return { rows, cols, re: randomMatrix(rows, cols).values, im: randomMatrix(rows, cols).values };
}

function difference(a: Float64Array, b: Float64Array): number {
  expect(a.length).toBe(b.length);
  return a.reduce((most, x, i) => Math.max(most, Math.abs(x - b[i])), 0);
}

// Panels are 24 and 32 wide: below, at, above and several of them.
const orders = [0, 1, 2, 3, 31, 32, 33, 75, 100];
// Random matrices of these seeds have conditions below 1e4: 1e4 · 100 · 2e-16.
const tolerance = 2e-10;

it.each(orders)("real LU of order %i gives back the solution it was asked for", (n) => {
  const a = randomMatrix(n, n);
  const x = randomMatrix(n, 3);
  const b = multiply(a, x);
  const lu = factorDense(a);
  lu.solveInPlace(b);
  expect(difference(b.values, x.values)).toBeLessThan(tolerance);
  expect(lu.order).toBe(n);
});

it.each(orders)("complex LU of order %i solves with A and with its adjoint", (n) => {
  const a = randomComplex(n, n);
  const x = randomComplex(n, 3);
  const lu = factorDenseComplex(a);
  const b = complexMultiply(a, x);
  lu.solveInPlace(b);
  expect(Math.max(difference(b.re, x.re), difference(b.im, x.im))).toBeLessThan(tolerance);
  const c = complexMultiplyAdjoint(a, x);
  lu.solveAdjointInPlace(c);
  expect(Math.max(difference(c.re, x.re), difference(c.im, x.im))).toBeLessThan(tolerance);
});

it("the determinant of a permuted complex triangle comes out in modulus and phase", () => {
  const a: ComplexMatrix = {
    rows: 3,
    cols: 3,
    re: Float64Array.of(0, 0, 0, 3, 0.5, 0, 0.25, 1, -1),
    im: Float64Array.of(0, 2, 0, 0, 0, 0, 0, 1, 1),
  };
  const lu = factorDenseComplex(a);
  // det = −[(2i)·3·(−1 + i)] = −(6i)(−1 + i) = 6i + 6.
  expect(lu.logAbsDet).toBeCloseTo(Math.log(6 * Math.SQRT2), 14);
  expect(lu.phaseDet).toBeCloseTo(Math.PI / 4, 14);
});

it("a singular matrix is solved along its null vector", () => {
  const a: DenseMatrix = { rows: 3, cols: 3, values: Float64Array.of(1, 2, 3, 2, 4, 6, 1, 0, 1) };
  const lu = factorDense(a);
  expect(lu.pivotRatio).toBeLessThan(1e-15);
  const b: DenseMatrix = { rows: 3, cols: 1, values: Float64Array.of(1, 1, 1.5) };
  lu.solveInPlace(b);
  // Null vector (2, −1, 0).
  expect(b.values[0] / b.values[1]).toBeCloseTo(-2, 12);
  expect(Math.abs(b.values[0])).toBeGreaterThan(1e14);
});

it("the zero matrix factors without a breakdown", () => {
  const lu = factorDense(zeros(3, 3));
  const b = randomMatrix(3, 1);
  lu.solveInPlace(b);
  expect(lu.pivotRatio).toBe(0);
  expect(b.values.every(Number.isFinite)).toBe(true);
});

it("a graded diagonal reports the ratio of its pivots", () => {
  expect(factorDense({ rows: 2, cols: 2, values: Float64Array.of(4, 0, 0, 1) }).pivotRatio).toBe(0.25);
});

it("LU refuses entries that are not finite", () => {
  const code = expect.objectContaining({ code: "numerics.not-finite" });
  expect(() => factorDense({ rows: 1, cols: 1, values: Float64Array.of(Number.NaN) })).toThrow(code);
  const bad: ComplexMatrix = {
    rows: 1,
    cols: 1,
    re: Float64Array.of(1),
    im: Float64Array.of(Number.POSITIVE_INFINITY),
  };
  expect(() => factorDenseComplex(bad)).toThrow(code);
});

it.each(orders)("the Cholesky factor of order %i multiplies back and solves", (n) => {
  const g = randomMatrix(n + 5, n);
  const a = multiplyTransposed(g, g);
  const l = cholesky(a)!;
  const u = zeros(n, n);
  for (let j = 0; j < n; j++)
    for (let i = 0; i < n; i++) u.values[i + j * n] = i <= j ? l.values[j + i * n] : 0;
  // Entries up to some 150, 100 products each.
  expect(difference(multiply(l, u).values, a.values)).toBeLessThan(1e-12);
  for (let j = 0; j < n; j++) for (let i = 0; i < j; i++) expect(l.values[i + j * n]).toBe(0);

  const x = randomMatrix(n, 5);
  const b = multiply(a, x);
  solveLowerInPlace(l, b);
  expect(difference(b.values, multiply(u, x).values)).toBeLessThan(tolerance);
  solveLowerTransposedInPlace(l, b);
  expect(difference(b.values, x.values)).toBeLessThan(tolerance);
});

it("Cholesky answers null for indefinite, semidefinite and NaN matrices", () => {
  expect(cholesky({ rows: 2, cols: 2, values: Float64Array.of(1, 2, 2, 1) })).toBeNull();
  expect(cholesky({ rows: 2, cols: 2, values: Float64Array.of(1, 1, 1, 1) })).toBeNull();
  expect(cholesky({ rows: 1, cols: 1, values: Float64Array.of(Number.NaN) })).toBeNull();
});
