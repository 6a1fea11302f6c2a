import { expect, it } from "vitest";
import { complexEigenvalues } from "../../src/numerics/dense/complex-eigen.js";
import { eigenvalues } from "../../src/numerics/dense/eigen.js";
import { factorDenseComplex } from "../../src/numerics/dense/lu.js";
import { type ComplexMatrix, complexZeros } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";

const eps = Number.EPSILON;

function complexOf(n: number, entry: (i: number, j: number) => readonly [number, number]): ComplexMatrix {
  const a = complexZeros(n, n);
  for (let j = 0; j < n; j++) for (let i = 0; i < n; i++) [a.re[i + j * n], a.im[i + j * n]] = entry(i, j);
  return a;
}

function randomComplex(n: number): ComplexMatrix {
  const random = createRandom(n);
  return complexOf(n, () => [random.normal(), random.normal()]);
}

/** Largest distance when each wanted value takes its nearest unused computed one. */
function distance(
  re: ArrayLike<number>,
  im: ArrayLike<number>,
  wantedRe: ArrayLike<number>,
  wantedIm: ArrayLike<number>,
): number {
  expect(re.length).toBe(wantedRe.length);
  const free = Array.from(re, (x, j) => [x, im[j]] as const);
  let worst = 0;
  for (let k = 0; k < wantedRe.length; k++) {
    const gaps = free.map(([x, y]) => Math.hypot(x - wantedRe[k], y - wantedIm[k]));
    const best = gaps.indexOf(Math.min(...gaps));
    expect(best).toBeGreaterThanOrEqual(0);
    worst = Math.max(worst, gaps[best]);
    free.splice(best, 1);
  }
  return worst;
}

it.each([0, 1, 2, 3, 5, 8, 40, 90])(
  "A − λI is singular for every eigenvalue of a random matrix of order %i",
  (n) => {
    const a = randomComplex(n);
    const { re, im } = complexEigenvalues(a);
    expect(re.length).toBe(n);
    for (let k = 0; k < n; k++) {
      const shifted = complexOf(n, (i, j) => [
        a.re[i + j * n] - (i === j ? re[k] : 0),
        a.im[i + j * n] - (i === j ? im[k] : 0),
      ]);
      // Smallest singular value of backward stable eigenvalues: eps n‖A‖, pivots a factor n above it.
      expect(factorDenseComplex(shifted).pivotRatio).toBeLessThan(Math.max(100 * n * eps, 1e-14));
    }
    // Trace and sum agree: n · eps · ‖A‖.
    let traceRe = 0;
    let traceIm = 0;
    for (let i = 0; i < n; i++) {
      traceRe += a.re[i + i * n];
      traceIm += a.im[i + i * n];
    }
    expect(Math.abs(re.reduce((s, x) => s + x, 0) - traceRe)).toBeLessThan(1e-11);
    expect(Math.abs(im.reduce((s, x) => s + x, 0) - traceIm)).toBeLessThan(1e-11);
  },
);

it("a real matrix has the same eigenvalues as by the real method", () => {
  const n = 50;
  const a = { ...randomComplex(n), im: new Float64Array(n * n) };
  const real = eigenvalues({ rows: n, cols: n, values: a.re });
  const { re, im } = complexEigenvalues(a);
  expect(distance(re, im, real.re, real.im)).toBeLessThan(1e-11);
});

it("turning a matrix by a phase turns its eigenvalues", () => {
  const n = 12;
  const a = randomComplex(n);
  const turned = complexOf(n, (i, j) => [-a.im[i + j * n], a.re[i + j * n]]);
  const first = complexEigenvalues(a);
  const second = complexEigenvalues(turned);
  expect(
    distance(
      second.im,
      second.re.map((x) => -x),
      first.re,
      first.im,
    ),
  ).toBeLessThan(1e-12);
});

it("Jordan blocks, cyclic shifts and triangles do not hang", () => {
  const jordan = complexEigenvalues(
    complexOf(5, (i, j) => (i === j ? [1, 2] : j === i + 1 ? [1, 0] : [0, 0])),
  );
  expect(Array.from(jordan.im)).toEqual([2, 2, 2, 2, 2]);
  const lower = complexEigenvalues(
    complexOf(5, (i, j) => (i === j ? [1, 2] : i === j + 1 ? [1, 0] : [0, 0])),
  );
  // A fivefold defective eigenvalue moves by the fifth root of eps.
  expect(distance(lower.re, lower.im, [1, 1, 1, 1, 1], [2, 2, 2, 2, 2])).toBeLessThan(5 * eps ** 0.2);
  const n = 16;
  const cyclic = complexEigenvalues(complexOf(n, (i, j) => (i === (j + 1) % n ? [0, 1] : [0, 0])));
  const angle = Array.from({ length: n }, (_, k) => (2 * Math.PI * k) / n + Math.PI / 2);
  expect(distance(cyclic.re, cyclic.im, angle.map(Math.cos), angle.map(Math.sin))).toBeLessThan(100 * eps);
});

it("balancing keeps the digits of a matrix in mixed units", () => {
  const n = 8;
  const base = randomComplex(n);
  const units = Array.from({ length: n }, (_, i) => 10 ** (4 * (i % 3)));
  const scaled = complexOf(n, (i, j) => [
    (base.re[i + j * n] * units[i]) / units[j],
    (base.im[i + j * n] * units[i]) / units[j],
  ]);
  const wanted = complexEigenvalues(base);
  const { re, im } = complexEigenvalues(scaled);
  expect(distance(re, im, wanted.re, wanted.im)).toBeLessThan(1e-12);
});

it("entries that are not finite are refused", () => {
  const a = complexOf(3, () => [0, Number.NaN]);
  expect(() => complexEigenvalues(a)).toThrow(expect.objectContaining({ code: "numerics.not-finite" }));
});
