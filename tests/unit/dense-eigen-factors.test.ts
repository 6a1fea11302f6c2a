import { expect, it } from "vitest";
import { eigen } from "../../src/numerics/dense/eigen.js";
import { type EigenFactors, eigenFactors } from "../../src/numerics/dense/eigen-factors.js";
import { factorDense } from "../../src/numerics/dense/lu.js";
import { type DenseMatrix, zeros } from "../../src/numerics/dense/matrix.js";
import { multiply, multiplyTransposed } from "../../src/numerics/dense/products.js";
import { quadraticEigen } from "../../src/numerics/dense/quadratic-eigen.js";
import { quadraticFactors } from "../../src/numerics/dense/quadratic-factors.js";
import { createRandom } from "../../src/numerics/random.js";

function random(rows: number, cols: number, seed: number): DenseMatrix {
  const source = createRandom(seed);
  const a = zeros(rows, cols);
  for (let q = 0; q < a.values.length; q++) a.values[q] = source.normal();
  return a;
}

/** Re and |Im| of C X diag(f(λ)) X⁻¹ B by plain sums; f gives [re, im]. */
function sumOf(
  { re, im, outputs, inputs }: EigenFactors,
  f: (re: number, im: number) => readonly [number, number],
): { values: DenseMatrix; imaginary: number } {
  const values = zeros(outputs.rows, inputs.cols);
  let imaginary = 0;
  for (let k = 0; k < inputs.cols; k++) {
    for (let i = 0; i < outputs.rows; i++) {
      let lost = 0;
      for (let j = 0; j < re.length; j++) {
        const [fRe, fIm] = f(re[j], im[j]);
        const [p, q] = [i + j * outputs.rows, j + k * re.length];
        const rRe = outputs.re[p] * inputs.re[q] - outputs.im[p] * inputs.im[q];
        const rIm = outputs.re[p] * inputs.im[q] + outputs.im[p] * inputs.re[q];
        values.values[i + k * outputs.rows] += rRe * fRe - rIm * fIm;
        lost += rRe * fIm + rIm * fRe;
      }
      imaginary = Math.max(imaginary, Math.abs(lost));
    }
  }
  return { values, imaginary };
}

function expectEqual(a: DenseMatrix, b: DenseMatrix, tolerance: number): void {
  const size = b.values.reduce((most, x) => Math.max(most, Math.abs(x)), 0);
  a.values.forEach((x, q) => {
    expect(Math.abs(x - b.values[q])).toBeLessThanOrEqual(tolerance * size);
  });
}

function expectFactors(a: DenseMatrix, b: DenseMatrix, c: DenseMatrix, tolerance: number): void {
  const factors = eigenFactors(a, b, c);
  const { values: product, imaginary } = sumOf(factors, () => [1, 0]);
  expectEqual(product, multiplyTransposed(c, b), tolerance);
  expect(imaginary).toBeLessThanOrEqual(tolerance * Math.max(1, ...product.values.map(Math.abs)));
  const applied = multiplyTransposed(c, multiply(a, b));
  expectEqual(sumOf(factors, (re, im) => [re, im]).values, applied, tolerance);
}

it.each([0, 1, 2, 3, 8, 41])("C X X⁻¹ B is C B, and C X Λ X⁻¹ B is C A B (order %i)", (n) => {
  // Eigenvectors of random matrices of these orders have condition numbers up to some hundreds.
  expectFactors(random(n, n, n + 1), random(n, 3, n + 2), random(n, 2, n + 3), 1e-11);
});

it("takes a matrix of mixed units, whose balancing the channels follow", () => {
  const n = 9;
  const a = random(n, n, 5);
  for (let j = 0; j < n; j++) for (let i = 0; i < n; i++) a.values[i + j * n] *= 10 ** (2 * (i - j));
  // Channels in the same units: D⁻¹B and CD of order 1.
  const b = random(n, 2, 6);
  const c = random(n, 2, 7);
  for (let q = 0; q < b.values.length; q++) {
    b.values[q] *= 100 ** (q % n);
    c.values[q] /= 100 ** (q % n);
  }
  expectFactors(a, b, c, 1e-11);
});

it("takes multiple eigenvalues that have all their vectors", () => {
  const n = 12;
  const turn = random(n, n, 9);
  const scaled = {
    ...turn,
    values: turn.values.map((x, q) => x * [2, 2, 2, -1, -1, 0.5][Math.floor(q / n) % 6]),
  };
  // A = V Λ V⁻¹ by solving with Vᵀ: Aᵀ = V⁻ᵀ (V Λ)ᵀ.
  const transposedOf = (m: DenseMatrix) => ({
    ...m,
    values: m.values.map((_, q) => m.values[Math.floor(q / n) + (q % n) * n]),
  });
  const adjoint = transposedOf(scaled);
  factorDense(transposedOf(turn)).solveInPlace(adjoint);
  // V has a condition number of some ten, and with it the roundings of A grow.
  expectFactors(transposedOf(adjoint), random(n, 2, 10), random(n, 2, 11), 1e-10);
});

it("has the eigenvalues of the full decomposition in the same order, to the last bit", () => {
  const a = random(40, 40, 12);
  const { re, im } = eigenFactors(a, zeros(40, 0), random(40, 1, 13));
  const full = eigen(a);
  expect(re).toEqual(full.re);
  expect(im).toEqual(full.im);
});

it("leaves A, B and C as they were", () => {
  const [a, b, c] = [random(6, 6, 14), random(6, 2, 15), random(6, 2, 16)];
  const before = [a, b, c].map((x) => x.values.slice());
  eigenFactors(a, b, c);
  expect([a, b, c].map((x) => x.values)).toEqual(before);
});

it("of a quadratic pencil give C P(s)⁻¹ B, with the poles of its decomposition", () => {
  const n = 7;
  const [m, c, s] = [random(n, n, 17), random(n, n, 18), random(n, n, 19)];
  for (let i = 0; i < n; i++) {
    m.values[i * (n + 1)] += 4;
    s.values[i * (n + 1)] += 20;
  }
  const [b, out] = [random(n, 2, 20), random(n, 3, 21)];
  const factors = quadraticFactors(m, c, s, 2, b, out);
  const eigenvalues = quadraticEigen(m, c, s, 2);
  expect(factors.re).toEqual(eigenvalues.re);
  expect(factors.im).toEqual(eigenvalues.im);
  for (const at of [0.3, 5]) {
    const p = { ...m, values: m.values.map((x, q) => at * at * x + at * c.values[q] + s.values[q]) };
    const solved = { ...b, values: b.values.slice() };
    factorDense(p).solveInPlace(solved);
    // 1/(1 − (s − s₀)θ) in terms of θ.
    const theta = { ...factors, re: factors.thetaRe, im: factors.thetaIm };
    const { values } = sumOf(theta, (re, im) => {
      const [dRe, dIm] = [1 - (at - factors.shift) * re, -(at - factors.shift) * im];
      const size = dRe * dRe + dIm * dIm;
      return [dRe / size, -dIm / size];
    });
    expectEqual(values, multiplyTransposed(out, solved), 1e-11);
  }
});
