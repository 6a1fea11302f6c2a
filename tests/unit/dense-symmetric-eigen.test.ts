import { EigenvalueDecomposition, Matrix } from "ml-matrix";
import { expect, it } from "vitest";
import { type DenseMatrix, zeros } from "../../src/numerics/dense/matrix.js";
import { multiply, multiplyTransposed } from "../../src/numerics/dense/products.js";
import { symmetricEigen, symmetricEigenvalues } from "../../src/numerics/dense/symmetric-eigen.js";
import { createRandom } from "../../src/numerics/random.js";

const eps = Number.EPSILON;

function symmetricOf(n: number, entry: (i: number, j: number) => number): DenseMatrix {
  const a = zeros(n, n);
  for (let j = 0; j < n; j++)
    for (let i = j; i < n; i++) a.values[i + j * n] = a.values[j + i * n] = entry(i, j);
  return a;
}

function randomSymmetric(n: number): DenseMatrix {
  const random = createRandom(n);
  return symmetricOf(n, () => random.normal());
}

const largest = (x: Float64Array): number => x.reduce((most, v) => Math.max(most, Math.abs(v)), 0);

// ‖AX − XΛ‖ and ‖XᵀX − I‖ in units of eps n‖A‖ and eps n: a few for a backward stable method.
function expectDecomposition(a: DenseMatrix): void {
  const n = a.rows;
  const { values, vectors } = symmetricEigen(a);
  const residual = multiply(a, vectors).values;
  for (let i = 0; i < residual.length; i++) residual[i] -= vectors.values[i] * values[Math.floor(i / n)];
  expect(largest(residual)).toBeLessThanOrEqual(8 * eps * n * largest(a.values));
  const gram = multiplyTransposed(vectors, vectors).values;
  for (let i = 0; i < n; i++) gram[i + i * n] -= 1;
  expect(largest(gram)).toBeLessThanOrEqual(8 * eps * n);
  for (let i = 1; i < n; i++) expect(values[i]).toBeGreaterThanOrEqual(values[i - 1]);
  const only = symmetricEigenvalues(a);
  for (let i = 0; i < n; i++)
    expect(Math.abs(only[i] - values[i])).toBeLessThanOrEqual(8 * eps * n * largest(a.values));
}

it.each([0, 1, 2, 3, 4, 5, 7, 40, 101])("a random symmetric matrix of order %i is decomposed", (n) => {
  expectDecomposition(randomSymmetric(n));
});

it("eigenvalues agree with ml-matrix", () => {
  const n = 40;
  const a = randomSymmetric(n);
  const rows = Array.from({ length: n }, (_, i) => Array.from(a.values.slice(i * n, i * n + n)));
  const expected = new EigenvalueDecomposition(new Matrix(rows)).realEigenvalues.sort((x, y) => x - y);
  // Both are backward stable: 40 · eps · ‖A‖ with ‖A‖ near 12.
  symmetricEigenvalues(a).forEach((x, i) => {
    expect(Math.abs(x - expected[i])).toBeLessThan(2e-13);
  });
});

it("the second-difference matrix has the eigenvalues 2 − 2 cos(kπ/(n+1))", () => {
  const n = 50;
  const values = symmetricEigenvalues(symmetricOf(n, (i, j) => (i === j ? 2 : i === j + 1 ? -1 : 0)));
  for (let k = 1; k <= n; k++)
    expect(Math.abs(values[k - 1] - (2 - 2 * Math.cos((k * Math.PI) / (n + 1))))).toBeLessThan(50 * eps);
});

it("repeated eigenvalues still get orthonormal vectors", () => {
  expectDecomposition(symmetricOf(30, () => 1));
  expectDecomposition(symmetricOf(6, (i, j) => (i === j ? 3 : 0)));
  expectDecomposition(zeros(5, 5));
});

it("entries near the ends of the number range neither overflow nor vanish", () => {
  for (const size of [1e300, 1e-300]) {
    const values = symmetricEigenvalues(symmetricOf(3, (i, j) => (i === j ? 2 * size : size)));
    expect(values[0] / size).toBeCloseTo(1, 13);
    expect(values[2] / size).toBeCloseTo(4, 13);
  }
});

it("only the lower triangle is read", () => {
  const a = randomSymmetric(6);
  const values = symmetricEigenvalues(a);
  for (let j = 0; j < 6; j++) for (let i = 0; i < j; i++) a.values[i + j * 6] = 99;
  // The scale, a power of two taken from all entries, changes no digit.
  expect(symmetricEigenvalues(a)).toEqual(values);
});

it("entries that are not finite are refused", () => {
  const a = symmetricOf(3, () => Number.NaN);
  expect(() => symmetricEigen(a)).toThrow(expect.objectContaining({ code: "numerics.not-finite" }));
});
