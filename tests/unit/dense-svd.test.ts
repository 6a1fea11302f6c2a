import { Matrix, SVD } from "ml-matrix";
import { expect, it } from "vitest";
import { type ComplexMatrix, type ComplexVector, complexZeros } from "../../src/numerics/dense/matrix.js";
import { complexMultiply, complexMultiplyAdjoint } from "../../src/numerics/dense/products.js";
import { largestSingular, largestSingularValue, singularValues } from "../../src/numerics/dense/svd.js";
import { createRandom } from "../../src/numerics/random.js";

function randomComplex(rows: number, cols: number): ComplexMatrix {
  const random = createRandom(rows + 1000 * cols);
  const a = complexZeros(rows, cols);
  for (let i = 0; i < a.re.length; i++) {
    a.re[i] = random.normal();
    a.im[i] = random.normal();
  }
  return a;
}

const asColumn = (x: ComplexVector): ComplexMatrix => ({ rows: x.re.length, cols: 1, re: x.re, im: x.im });
const norm = (x: ComplexVector): number => Math.hypot(...x.re, ...x.im);

function gap(a: ComplexVector, b: ComplexVector, factor: number): number {
  return Math.hypot(...a.re.map((x, i) => x - factor * b.re[i]), ...a.im.map((x, i) => x - factor * b.im[i]));
}

/** The triple in all its relations; 1e-14 relative to σ is some 50 eps. */
function expectLargest(h: ComplexMatrix): number {
  const { sigma, u, v } = largestSingular(h);
  expect(u.re.length).toBe(h.rows);
  expect(v.re.length).toBe(h.cols);
  if (h.rows > 0) expect(Math.abs(norm(u) - 1)).toBeLessThan(1e-14);
  if (h.cols > 0) expect(Math.abs(norm(v) - 1)).toBeLessThan(1e-14);
  expect(gap(complexMultiply(h, asColumn(v)), u, sigma)).toBeLessThanOrEqual(1e-14 * sigma);
  expect(gap(complexMultiplyAdjoint(h, asColumn(u)), v, sigma)).toBeLessThanOrEqual(2e-14 * sigma);
  expect(Math.abs(largestSingularValue(h) - sigma)).toBeLessThanOrEqual(1e-14 * sigma);
  const all = singularValues(h);
  expect(all.length).toBe(Math.min(h.rows, h.cols));
  if (all.length > 0) expect(Math.abs(all[0] - sigma)).toBeLessThanOrEqual(1e-14 * sigma);
  return sigma;
}

it.each([
  [1, 1],
  [1, 4],
  [4, 1],
  [2, 2],
  [3, 2],
  [2, 5],
  [12, 12],
  [7, 30],
  [30, 7],
])("the largest singular triple of a random %i×%i matrix satisfies its relations", (rows, cols) => {
  expect(expectLargest(randomComplex(rows, cols))).toBeGreaterThan(0);
});

it("empty and zero matrices have σ = 0 and vectors of the right length", () => {
  for (const [rows, cols] of [
    [0, 0],
    [3, 0],
    [0, 3],
    [3, 2],
    [2, 3],
  ]) {
    expect(expectLargest(complexZeros(rows, cols))).toBe(0);
  }
});

it("a multiple largest singular value still gives a valid triple", () => {
  const h = complexZeros(6, 6);
  for (let i = 0; i < 6; i++) h.im[((i * 5) % 6) + i * 6] = i < 4 ? 2 : 1;
  expect(expectLargest(h)).toBe(2);
});

it("a rank-one matrix has the product of the norms", () => {
  const a = randomComplex(5, 1);
  const b = randomComplex(4, 1);
  const adjoint = { rows: 1, cols: 4, re: b.re, im: b.im.map((x) => -x) };
  expect(expectLargest(complexMultiply(a, adjoint)) / (norm(a) * norm(b))).toBeCloseTo(1, 14);
});

it("entries whose squares would overflow or vanish keep their digits", () => {
  const base = randomComplex(4, 3);
  const sigma = largestSingularValue(base);
  for (const size of [1e250, 1e-250]) {
    const h = { ...base, re: base.re.map((x) => x * size), im: base.im.map((x) => x * size) };
    expect(largestSingularValue(h) / size / sigma).toBeCloseTo(1, 13);
    expect(largestSingular(h).sigma / size / sigma).toBeCloseTo(1, 13);
    expect(singularValues(h)[0] / size / sigma).toBeCloseTo(1, 13);
  }
});

it("all singular values agree with ml-matrix through the real form", () => {
  const [rows, cols] = [9, 6];
  const h = randomComplex(rows, cols);
  // [[Re, −Im], [Im, Re]] has every singular value of H twice.
  const real = Array.from({ length: 2 * rows }, (_, i) =>
    Array.from({ length: 2 * cols }, (_, j) => {
      const p = (i % rows) + (j % cols) * rows;
      const sameHalf = i < rows === j < cols;
      return sameHalf ? h.re[p] : i < rows ? -h.im[p] : h.im[p];
    }),
  );
  const expected = new SVD(new Matrix(real)).diagonal;
  const values = singularValues(h);
  // Both accurate to some 10 eps ‖H‖.
  for (let k = 0; k < cols; k++) expect(Math.abs(values[k] - expected[2 * k])).toBeLessThan(1e-13);
  for (let k = 1; k < cols; k++) expect(values[k]).toBeLessThanOrEqual(values[k - 1]);
});

it("small singular values of scaled columns keep their relative accuracy", () => {
  const h = complexZeros(3, 3);
  h.re.set([1, 1, 0, 1e-20, -1e-20, 0, 0, 0, 1e-40]);
  const values = singularValues(h);
  expect(values[1] / (Math.SQRT2 * 1e-20)).toBeCloseTo(1, 14);
  expect(values[2] / 1e-40).toBeCloseTo(1, 14);
});

it("entries that are not finite are refused", () => {
  const h = complexZeros(2, 2);
  h.im[3] = Number.NEGATIVE_INFINITY;
  const code = expect.objectContaining({ code: "numerics.not-finite" });
  for (const compute of [largestSingular, largestSingularValue, singularValues])
    expect(() => compute(h)).toThrow(code);
});

it.each([24, 72, 120])("a gain matrix of order %i and low rank has its largest singular value", (n) => {
  // H = Σ σ_k u_k v_kᵀ with a handful of terms: most values of HᴴH are rounding.
  for (let seed = 1; seed <= 5; seed++) {
    const h = complexZeros(n, n);
    for (let k = 1; k <= 6; k++) {
      for (let j = 0; j < n; j++) {
        for (let i = 0; i < n; i++) {
          const entry = 10 ** -k * Math.sin(i * k + i + seed) * Math.cos(j * k + k);
          h.re[i + j * n] += entry;
          h.im[i + j * n] += 0.5 * entry;
        }
      }
    }
    const { sigma } = largestSingular(h);
    expect(Math.abs(largestSingularValue(h) - sigma)).toBeLessThan(1e-13 * sigma);
    expect(Math.abs(singularValues(h)[0]! - sigma)).toBeLessThan(1e-13 * sigma);
  }
});
