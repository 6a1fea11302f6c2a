import { describe, expect, it } from "vitest";
import { orthogonaliseInPlace } from "../../src/numerics/dense/complex-gram-schmidt.js";
import { innerProduct, norm2, normaliseInPlace } from "../../src/numerics/dense/complex-vectors.js";
import {
  type ComplexVector,
  complexColumn,
  complexVector,
  complexZeros,
} from "../../src/numerics/dense/matrix.js";
import { createRandom, type Random } from "../../src/numerics/random.js";
import { denseOperator, sparseOperator } from "../../src/numerics/real-operator.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";

function randomVector(random: Random, n: number): ComplexVector {
  const x = complexVector(n);
  for (let i = 0; i < n; i++) {
    x.re[i] = random.normal();
    x.im[i] = random.normal();
  }
  return x;
}

describe("classical Gram–Schmidt twice", () => {
  // Sizes on both sides of the slab of 256 rows, counts on both sides of the group of four columns.
  it.each([
    [5, 5],
    [256, 9],
    [601, 22],
  ])("makes %i rows and %i nearly dependent columns orthonormal and tells how", (n, cols) => {
    const random = createRandom(n);
    const v = complexZeros(n, cols);
    const given = complexVector(n);
    const h = complexVector(cols);
    const common = randomVector(random, n);
    for (let k = 0; k < cols; k++) {
      const w = complexColumn(v, k);
      const fresh = randomVector(random, n);
      for (let i = 0; i < n; i++) {
        w.re[i] = common.re[i] + 1e-5 * fresh.re[i];
        w.im[i] = common.im[i] + 1e-5 * fresh.im[i];
      }
      given.re.set(w.re);
      given.im.set(w.im);
      h.re.fill(Number.NaN);
      orthogonaliseInPlace(w, v, k, h);
      const left = { re: w.re.slice(), im: w.im.slice() };
      normaliseInPlace(w);
      for (let j = 0; j < k; j++) {
        const q = complexColumn(v, j);
        const overlap = innerProduct(q, w);
        // A few eps times √n; one pass would leave 1e-11.
        expect(Math.hypot(overlap.re, overlap.im)).toBeLessThan(1e-14);
        for (let i = 0; i < n; i++) {
          left.re[i] += h.re[j] * q.re[i] - h.im[j] * q.im[i];
          left.im[i] += h.re[j] * q.im[i] + h.im[j] * q.re[i];
        }
      }
      for (let i = 0; i < n; i++) {
        left.re[i] -= given.re[i];
        left.im[i] -= given.im[i];
      }
      expect(norm2(left)).toBeLessThan(1e-14 * norm2(given));
    }
  });
});

describe("a real operator", () => {
  const random = createRandom(4);
  const [rows, cols] = [7, 5];
  const values = Float64Array.from({ length: rows * cols }, (_, p) => (p % 3 === 0 ? 0 : random.normal()));
  const places = Array.from(values.keys()).filter((p) => values[p] !== 0);
  const sparse = fromTriplets(
    rows,
    cols,
    places.map((p) => p % rows),
    places.map((p) => Math.floor(p / rows)),
    places.map((p) => values[p]!),
  );
  const entry = (i: number, j: number) => values[i + j * rows]!;
  const [cRe, cIm] = [0.3, -1.7];

  it.each([
    ["sparse", sparseOperator(sparse)],
    ["dense", denseOperator({ rows, cols, values })],
  ])("that is %s adds c A x and c Aᵀ x of a complex vector", (_, a) => {
    const products = [
      { x: randomVector(random, cols), y: randomVector(random, rows), add: a.addInto, at: entry },
      {
        x: randomVector(random, rows),
        y: randomVector(random, cols),
        add: a.addTransposedInto,
        at: (i: number, j: number) => entry(j, i),
      },
    ];
    for (const { x, y, add, at } of products) {
      const before = { re: y.re.slice(), im: y.im.slice() };
      add(y, cRe, cIm, x);
      y.re.forEach((_value, i) => {
        let [re, im] = [before.re[i]!, before.im[i]!];
        x.re.forEach((xRe, j) => {
          re += at(i, j) * (cRe * xRe - cIm * x.im[j]!);
          im += at(i, j) * (cRe * x.im[j]! + cIm * xRe);
        });
        // A dozen terms of size one.
        expect(Math.abs(y.re[i]! - re)).toBeLessThan(1e-14);
        expect(Math.abs(y.im[i]! - im)).toBeLessThan(1e-14);
      });
    }
    let largest = 0;
    for (let i = 0; i < rows; i++) {
      let sum = 0;
      for (let j = 0; j < cols; j++) sum += Math.abs(entry(i, j));
      largest = Math.max(largest, sum);
    }
    expect(a.normBound).toBeGreaterThanOrEqual(largest * (1 - 1e-15));
  });
});
