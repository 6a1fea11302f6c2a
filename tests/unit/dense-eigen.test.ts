import { EigenvalueDecomposition, Matrix } from "ml-matrix";
import { expect, it } from "vitest";
import { eigen, eigenvalues } from "../../src/numerics/dense/eigen.js";
import { type ComplexMatrix, type DenseMatrix, zeros } from "../../src/numerics/dense/matrix.js";
import { complexMultiply, complexMultiplyAdjoint } from "../../src/numerics/dense/products.js";
import { createRandom } from "../../src/numerics/random.js";

const eps = Number.EPSILON;

function matrixOf(n: number, entry: (i: number, j: number) => number): DenseMatrix {
  const a = zeros(n, n);
  for (let j = 0; j < n; j++) for (let i = 0; i < n; i++) a.values[i + j * n] = entry(i, j);
  return a;
}

function randomMatrix(n: number): DenseMatrix {
  const random = createRandom(n + 100);
  return matrixOf(n, () => random.normal());
}

const transposed = (a: DenseMatrix): DenseMatrix => matrixOf(a.rows, (i, j) => a.values[j + i * a.rows]);
const complexOf = (a: DenseMatrix): ComplexMatrix => ({
  rows: a.rows,
  cols: a.cols,
  re: a.values,
  im: new Float64Array(a.values.length),
});

const maximum = (x: Float64Array): number => x.reduce((most, v) => Math.max(most, Math.abs(v)), 0);
const frobenius = (a: DenseMatrix): number => Math.sqrt(a.values.reduce((sum, x) => sum + x * x, 0));

function columnNorm(a: ComplexMatrix, j: number): number {
  let sum = 0;
  for (let i = j * a.rows; i < (j + 1) * a.rows; i++) sum += a.re[i] ** 2 + a.im[i] ** 2;
  return Math.sqrt(sum);
}

/** Norm of column j of A X − X diag(re + i im). */
function columnResidual(ax: ComplexMatrix, x: ComplexMatrix, re: number, im: number, j: number): number {
  const r: ComplexMatrix = {
    rows: x.rows,
    cols: 1,
    re: new Float64Array(x.rows),
    im: new Float64Array(x.rows),
  };
  for (let i = 0; i < x.rows; i++) {
    const p = i + j * x.rows;
    r.re[i] = ax.re[p] - (x.re[p] * re - x.im[p] * im);
    r.im[i] = ax.im[p] - (x.re[p] * im + x.im[p] * re);
  }
  return columnNorm(r, 0);
}

/** Residuals of both sides, the scaling, and the agreement with `eigenvalues`, for a balanced matrix. */
function expectEigen(a: DenseMatrix, factor = 10): ReturnType<typeof eigen> {
  const n = a.rows;
  const result = eigen(a);
  const { re, im, right, left, defective } = result;
  // Backward stable: residuals below a few eps n‖A‖ times the norm of the vector.
  const limit = factor * eps * n * frobenius(a);
  const ax = complexMultiply(complexOf(a), right);
  const ay = complexMultiply(complexOf(transposed(a)), left);
  const overlap = complexMultiplyAdjoint(left, right);
  for (let j = 0; j < n; j++) {
    expect(Math.abs(columnNorm(right, j) - 1)).toBeLessThan(10 * eps * n);
    expect(columnResidual(ax, right, re[j], im[j], j)).toBeLessThanOrEqual(limit);
    // Aᵀ y = λ̄ y is yᴴ A = λ yᴴ.
    expect(columnResidual(ay, left, re[j], -im[j], j)).toBeLessThanOrEqual(limit * columnNorm(left, j));
    if (defective[j]) {
      expect(Math.abs(columnNorm(left, j) - 1)).toBeLessThan(10 * eps * n);
    } else {
      const scale = 10 * eps * n * columnNorm(left, j);
      expect(Math.abs(overlap.re[j + j * n] - 1)).toBeLessThan(scale);
      expect(Math.abs(overlap.im[j + j * n])).toBeLessThan(scale);
    }
  }
  expectPairs(re, im);
  return result;
}

function expectPairs(re: Float64Array, im: Float64Array): void {
  for (let j = 0; j < re.length; j++) {
    if (im[j] === 0) continue;
    expect(im[j]).toBeGreaterThan(0);
    expect(im[j + 1]).toBe(-im[j]);
    expect(re[j + 1]).toBe(re[j]);
    j++;
  }
}

/** Largest distance when each wanted value takes its nearest unused computed one. */
function distance(
  re: ArrayLike<number>,
  im: ArrayLike<number>,
  wantedRe: ArrayLike<number>,
  wantedIm: ArrayLike<number>,
): number {
  expect(re.length).toBe(wantedRe.length);
  const free = new Set(Array.from(re).keys());
  let worst = 0;
  for (let k = 0; k < wantedRe.length; k++) {
    let best = -1;
    let least = Number.POSITIVE_INFINITY;
    for (const j of free) {
      const gap = Math.hypot(re[j] - wantedRe[k], im[j] - wantedIm[k]);
      if (gap < least) {
        least = gap;
        best = j;
      }
    }
    expect(best).toBeGreaterThanOrEqual(0);
    free.delete(best);
    worst = Math.max(worst, least);
  }
  return worst;
}

it.each([0, 1, 2, 3, 4, 5, 6, 9, 33, 34, 70, 101])(
  "random matrices of order %i satisfy both eigen equations",
  (n) => {
    const a = randomMatrix(n);
    const full = expectEigen(a);
    const only = eigenvalues(a);
    expectPairs(only.re, only.im);
    // Conditions of the eigenvalues of these matrices stay below 1e3.
    expect(distance(only.re, only.im, full.re, full.im)).toBeLessThan(1e-10);
  },
);

it("eigenvalues agree with ml-matrix", () => {
  const n = 60;
  const a = randomMatrix(n);
  const rows = Array.from({ length: n }, (_, i) => Array.from({ length: n }, (_, j) => a.values[i + j * n]));
  const other = new EigenvalueDecomposition(new Matrix(rows));
  const { re, im } = eigenvalues(a);
  expect(distance(re, im, other.realEigenvalues, other.imaginaryEigenvalues)).toBeLessThan(1e-10);
});

it("the 2×2 cases come out right: real, complex, triangular, multiple", () => {
  const of = (a: number, b: number, c: number, d: number) =>
    eigenvalues({ rows: 2, cols: 2, values: Float64Array.of(a, c, b, d) });
  expect(distance([1, 3], [0, 0], of(2, 1, 1, 2).re, of(2, 1, 1, 2).im)).toBeLessThan(4 * eps);
  expect(of(1, -4, 1, 1).im[0]).toBeCloseTo(2, 14);
  expect(Array.from(of(5, 7, 0, 5).re)).toEqual([5, 5]);
  expect(Array.from(of(5, 0, 7, 5).re)).toEqual([5, 5]);
  expect(distance([0, 0], [1, -1], of(0, 1, -1, 0).re, of(0, 1, -1, 0).im)).toBeLessThan(4 * eps);
});

it("a lower triangular 2×2 matrix gives its diagonal to the last digit beside a large entry", () => {
  const { re } = eigenvalues({ rows: 2, cols: 2, values: Float64Array.of(0.1, 7, 0, 1e10) });
  expect(Array.from(re).sort((x, y) => x - y)).toEqual([0.1, 1e10]);
});

it("a Jordan block keeps its eigenvalue and is reported as defective", () => {
  const { re, defective } = expectEigen(matrixOf(4, (i, j) => (i === j ? 2 : j === i + 1 ? 1 : 0)));
  expect(Array.from(re)).toEqual([2, 2, 2, 2]);
  expect(Array.from(defective)).toEqual([1, 1, 1, 1]);
  const nilpotent = expectEigen(matrixOf(5, (i, j) => (j === i + 1 ? 1 : 0)));
  expect(Array.from(nilpotent.re)).toEqual([0, 0, 0, 0, 0]);
  expect(Array.from(nilpotent.defective)).toEqual([1, 1, 1, 1, 1]);
});

it("a Jordan block in other coordinates has eigenvalues within the square root of eps", () => {
  const random = createRandom(5);
  const v = [1, 2, 3].map(() => random.normal());
  const length = v.reduce((s, x) => s + x * x, 0);
  const reflect = (i: number, j: number) => (i === j ? 1 : 0) - (2 * v[i] * v[j]) / length;
  const jordan = [
    [3, 1, 0],
    [0, 3, 0],
    [0, 0, -1],
  ];
  const a = matrixOf(3, (i, j) => {
    let sum = 0;
    for (let k = 0; k < 3; k++)
      for (let l = 0; l < 3; l++) sum += reflect(i, k) * jordan[k][l] * reflect(l, j);
    return sum;
  });
  const { re, im } = expectEigen(a);
  expect(distance(re, im, [3, 3, -1], [0, 0, 0])).toBeLessThan(10 * Math.sqrt(eps));
});

it("repeated semisimple eigenvalues have valid vectors and are not defective", () => {
  const { re, defective } = expectEigen(matrixOf(7, (i, j) => (i === j ? 4 : 0)));
  expect(Array.from(re)).toEqual([4, 4, 4, 4, 4, 4, 4]);
  expect(maximum(Float64Array.from(defective))).toBe(0);
  expectEigen(zeros(3, 3));
  const ones = expectEigen(matrixOf(6, () => 1));
  expect(distance(ones.re, ones.im, [6, 0, 0, 0, 0, 0], [0, 0, 0, 0, 0, 0])).toBeLessThan(60 * eps);
});

it("cyclic permutations, on which unshifted QR stands still, give the roots of unity", () => {
  for (const n of [3, 4, 8, 50]) {
    const { re, im } = expectEigen(matrixOf(n, (i, j) => (i === (j + 1) % n ? 1 : 0)));
    const angle = Array.from({ length: n }, (_, k) => (2 * Math.PI * k) / n);
    expect(distance(re, im, angle.map(Math.cos), angle.map(Math.sin))).toBeLessThan(10 * n * eps);
  }
});

it("the Frank matrix of order 12 has positive real eigenvalues in reciprocal pairs", () => {
  const n = 12;
  const { re, im } = expectEigen(matrixOf(n, (i, j) => (j < i - 1 ? 0 : n - Math.max(i, j))));
  const sorted = Array.from(re).sort((x, y) => x - y);
  // The small ones have condition about 1e7 (Wilkinson, 1965), so 1e7 · 12 · eps relative to ‖A‖ ~ 50.
  for (let k = 0; k < n / 2; k++) expect(Math.abs(sorted[k] * sorted[n - 1 - k] - 1)).toBeLessThan(1e-5);
  expect(maximum(im)).toBeLessThan(1e-6);
});

it("a companion matrix gives back the roots of its polynomial", () => {
  // (x − 1)(x − 2)(x + 3)(x² + 2x + 5)(x² + 1), its coefficients multiplied out here.
  const factors = [
    [-1, 1],
    [-2, 1],
    [3, 1],
    [5, 2, 1],
    [1, 0, 1],
  ];
  const polynomial = factors.reduce((p, q) => {
    const out = new Array<number>(p.length + q.length - 1).fill(0);
    p.forEach((x, i) => {
      q.forEach((y, j) => {
        out[i + j] += x * y;
      });
    });
    return out;
  });
  const n = polynomial.length - 1;
  const { re, im } = expectEigen(matrixOf(n, (i, j) => (j === n - 1 ? -polynomial[i] : i === j + 1 ? 1 : 0)));
  expect(distance(re, im, [1, 2, -3, -1, -1, 0, 0], [0, 0, 0, 2, -2, 1, -1])).toBeLessThan(1e-12);
});

it("balancing saves the small eigenvalues of a matrix in mixed units", () => {
  const n = 8;
  const random = createRandom(9);
  const base = matrixOf(n, (i, j) => (i === j ? i + 1 : 0.2 * random.normal()));
  const expected = eigenvalues(base);
  const units = Array.from({ length: n }, (_, i) => 10 ** (4 * (i % 3)));
  const scaled = matrixOf(n, (i, j) => (base.values[i + j * n] * units[i]) / units[j]);
  const { re, im } = eigenvalues(scaled);
  // Same digits as in good units; unbalanced QR would lose eight of them.
  expect(distance(re, im, expected.re, expected.im)).toBeLessThan(1e-12);
  const { right, left } = eigen(scaled);
  const gram = complexMultiplyAdjoint(left, right);
  for (let j = 0; j < n; j++) expect(gram.re[j + j * n]).toBeCloseTo(1, 12);
  // x/units is an eigenvector of the matrix in good units.
  for (let j = 0; j < n; j++) {
    let worst = 0;
    let size = 0;
    for (let i = 0; i < n; i++) {
      let sumRe = 0;
      for (let k = 0; k < n; k++) sumRe += (base.values[i + k * n] * right.re[k + j * n]) / units[k];
      const p = i + j * n;
      worst = Math.max(worst, Math.abs(sumRe - (re[j] * right.re[p] - im[j] * right.im[p]) / units[i]));
      size = Math.max(size, Math.abs(right.re[p] / units[i]));
    }
    expect(worst).toBeLessThan(1e-12 * size);
  }
});

it("triangular and graded matrices keep their diagonal", () => {
  const diagonal = Array.from({ length: 10 }, (_, i) => 10 ** -i);
  const upper = eigen(matrixOf(10, (i, j) => (i === j ? diagonal[i] : j > i ? 1 : 0)));
  expect(distance(upper.re, upper.im, diagonal, new Array<number>(10).fill(0))).toBe(0);
});

it("numbers near the ends of the range neither overflow nor vanish", () => {
  const base = randomMatrix(12);
  const expected = eigenvalues(base);
  for (const size of [1e300, 1e-300]) {
    const { re, im } = eigen(matrixOf(12, (i, j) => base.values[i + j * 12] * size));
    expect(
      distance(
        re.map((x) => x / size),
        im.map((x) => x / size),
        expected.re,
        expected.im,
      ),
    ).toBeLessThan(1e-12);
  }
});

it("extremely nonnormal triangles do not overflow", () => {
  const { right, left } = eigen(matrixOf(60, (i, j) => (i === j ? 1 + i * 1e-14 : j > i ? 1e8 : 0)));
  for (const part of [right.re, right.im, left.re, left.im]) expect(part.every(Number.isFinite)).toBe(true);
});

it("entries that are not finite are refused at once", () => {
  for (const bad of [Number.NaN, Number.POSITIVE_INFINITY]) {
    const a = matrixOf(4, (i, j) => (i === 1 && j === 2 ? bad : 1));
    const code = expect.objectContaining({ code: "numerics.not-finite" });
    expect(() => eigenvalues(a)).toThrow(code);
    expect(() => eigen(a)).toThrow(code);
  }
});
