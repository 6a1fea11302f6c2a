import { expect, it } from "vitest";
import { factorDense } from "../../src/numerics/dense/lu.js";
import { type DenseMatrix, zeros } from "../../src/numerics/dense/matrix.js";
import { multiply, multiplyTransposed } from "../../src/numerics/dense/products.js";
import { createRandom } from "../../src/numerics/random.js";
import {
  type LanczosOptions,
  type LanczosResult,
  type ShiftInvertProblem,
  shiftInvertLanczos,
} from "../../src/numerics/sparse/lanczos.js";

function matrixOf(n: number, entry: (i: number, j: number) => number): DenseMatrix {
  const a = zeros(n, n);
  for (let j = 0; j < n; j++) for (let i = 0; i < n; i++) a.values[i + j * n] = entry(i, j);
  return a;
}

const diagonal = (values: readonly number[]): DenseMatrix =>
  matrixOf(values.length, (i, j) => (i === j ? values[i] : 0));

/** Free–free chain of springs: λ = 2 − 2 cos(kπ/n), k = 0 … n − 1, for unit masses. */
const chain = (n: number): DenseMatrix =>
  matrixOf(n, (i, j) => (i === j ? (i === 0 || i === n - 1 ? 1 : 2) : Math.abs(i - j) === 1 ? -1 : 0));

function problemOf(k: DenseMatrix, m: DenseMatrix, shift: number): ShiftInvertProblem {
  const n = k.rows;
  const lu = factorDense(matrixOf(n, (i, j) => k.values[i + j * n] - shift * m.values[i + j * n]));
  return {
    order: n,
    shift,
    applyMassInto: (y, x) => {
      y.set(multiply(m, { rows: n, cols: 1, values: x }).values);
    },
    solveInPlace: (b) => lu.solveInPlace(b),
  };
}

const base = { blockSize: 3, tolerance: 1e-11, maximumSolves: 5000 };

interface Case {
  k: DenseMatrix;
  m: DenseMatrix;
  shift: number;
  wanted: readonly number[];
  options: Partial<LanczosOptions> & Pick<LanczosOptions, "lower" | "upper">;
}

/** Runs and checks values, M-orthonormality, residuals K x − λ M x, and completeness. */
function expectModes({ k, m, shift, wanted, options }: Case): LanczosResult {
  const result = shiftInvertLanczos(problemOf(k, m, shift), {
    ...base,
    random: createRandom(11),
    expected: wanted.length,
    ...options,
  });
  expect(result.status).toBe("complete");
  expect(result.values.length).toBe(wanted.length);
  // A relative residual of 1e-11 in the shift-inverted sense bounds the error of λ by 1e-11 |λ − μ|.
  result.values.forEach((value, j) => {
    expect(Math.abs(value - wanted[j])).toBeLessThan(1e-11 * Math.abs(wanted[j] - shift) + 1e-14);
  });
  const gram = multiplyTransposed(result.vectors, multiply(m, result.vectors));
  for (let j = 0; j < gram.cols; j++)
    for (let i = 0; i < gram.rows; i++)
      expect(Math.abs(gram.values[i + j * gram.rows] - (i === j ? 1 : 0))).toBeLessThan(1e-11);
  const kx = multiply(k, result.vectors).values;
  const mx = multiply(m, result.vectors).values;
  const size = k.values.reduce((most, x) => Math.max(most, Math.abs(x)), 0);
  for (let i = 0; i < kx.length; i++) {
    const value = result.values[Math.floor(i / k.rows)];
    expect(Math.abs(kx[i] - value * mx[i])).toBeLessThan(1e-9 * size);
  }
  for (const residual of result.residuals) expect(residual).toBeLessThanOrEqual(base.tolerance);
  return result;
}

const range = (count: number, f: (k: number) => number): number[] =>
  Array.from({ length: count }, (_, k) => f(k));
const chainValue = (n: number, k: number): number => 2 - 2 * Math.cos((k * Math.PI) / n);

it("the lowest modes of a free chain, the rigid one among them, come out with the shift below zero", () => {
  const n = 120;
  expectModes({
    k: chain(n),
    m: diagonal(range(n, () => 1)),
    shift: -0.01,
    wanted: range(20, (k) => chainValue(n, k)),
    options: { lower: -0.01, upper: (chainValue(n, 19) + chainValue(n, 20)) / 2 },
  });
});

it("a shift inside the interval finds the modes on both sides", () => {
  const n = 150;
  const [first, last] = [40, 70];
  expectModes({
    k: chain(n),
    m: diagonal(range(n, () => 1)),
    shift: (chainValue(n, 55) + chainValue(n, 56)) / 2,
    wanted: range(last - first + 1, (k) => chainValue(n, first + k)),
    options: {
      lower: (chainValue(n, first - 1) + chainValue(n, first)) / 2,
      upper: (chainValue(n, last) + chainValue(n, last + 1)) / 2,
    },
  });
});

it("a long search is restarted within its bounded basis and still ends", () => {
  // Crowded values far from the shift: θ = 1/λ lie so close that one basis of 2·6 + 40 + 4·4 does not do.
  const n = 400;
  const values = range(n, (k) => 1 + 1e-3 * k);
  const result = expectModes({
    k: diagonal(values),
    m: diagonal(range(n, () => 1)),
    shift: 0,
    wanted: values.slice(0, 6),
    options: { lower: 0, upper: 1.0055, blockSize: 4 },
  });
  expect(result.solves).toBeGreaterThan(2 * 68);
});

it.each([1, 2, 3, 5])("triple and fivefold eigenvalues are found whole with blocks of %i", (blockSize) => {
  const wanted = [1, 1, 1, 2, 3, 3, 3, 3, 3, 4.5];
  const values = [...wanted, ...range(90, (k) => 6 + k)];
  expectModes({
    k: diagonal(values),
    m: diagonal(range(100, () => 1)),
    shift: 0,
    wanted,
    options: { lower: 0, upper: 5, blockSize },
  });
});

it.each([1, 3, 4])(
  "two square membranes side by side show all modes, pairs fourfold, by blocks of %i",
  (blockSize) => {
    // Fixed edges, 14×14 inner points each: λ = 4 − 2 cos(pπ/15) − 2 cos(qπ/15), twice for p = q, four times else.
    const side = 14;
    const n = 2 * side * side;
    const neighbours = (i: number, j: number) => {
      const [low, high] = i < j ? [i, j] : [j, i];
      return high - low === side
        ? low % (side * side) < side * (side - 1)
        : high - low === 1 && high % side > 0;
    };
    const k = matrixOf(n, (i, j) => (i === j ? 4 : neighbours(i, j) ? -1 : 0));
    const cosine = (p: number) => 2 * Math.cos(((p + 1) * Math.PI) / (side + 1));
    const all = range(n, (t) => 4 - cosine(t % side) - cosine(Math.floor(t / side) % side)).sort(
      (a, b) => a - b,
    );
    const upper = 1.5;
    expectModes({
      k,
      m: diagonal(range(n, () => 1)),
      shift: -0.05,
      wanted: all.filter((value) => value < upper),
      options: { lower: -0.05, upper, blockSize },
    });
  },
);

it("copies beyond the block size are found by deflation, before rounding errors would bring them in", () => {
  // The Krylov space of one vector does not end here, yet in exact arithmetic holds one copy only.
  const n = 3000;
  const values = range(n, (k) => (k < 6 ? 1 : 2 + 0.5 * (k - 6)));
  const result = shiftInvertLanczos(
    {
      order: n,
      shift: 0,
      applyMassInto: (y, x) => y.set(x),
      solveInPlace: (b) => {
        for (let p = 0; p < b.values.length; p++) b.values[p] /= values[p % n];
      },
    },
    {
      lower: 0,
      upper: 5.2,
      expected: 13,
      blockSize: 1,
      tolerance: 1e-6,
      // 59 are needed with the deflation, 72 without it.
      maximumSolves: 65,
      random: createRandom(3),
    },
  );
  expect(result.status).toBe("complete");
  // Errors of λ go with the square of the residual.
  result.values.forEach((value, j) => {
    expect(Math.abs(value - values[j])).toBeLessThan(1e-10);
  });
});

it("a search cut short at any point, restarts included, returns what it has", () => {
  const n = 120;
  const problem = problemOf(diagonal(range(n, (k) => 1 + 1e-3 * k)), diagonal(range(n, () => 1)), 0);
  for (let maximumSolves = 0; maximumSolves < 130; maximumSolves += 1) {
    const result = shiftInvertLanczos(problem, {
      ...base,
      lower: 0,
      upper: 1.0015,
      expected: 2,
      blockSize: 2,
      maximumSolves,
      random: createRandom(2),
    });
    expect(result.vectors.cols).toBe(result.values.length);
    expect(result.status).toBe(result.values.length < 2 ? "incomplete" : "complete");
  }
});

it("solves that are sloppy in the massless rows do not spoil the vectors", () => {
  const n = 41;
  const k = matrixOf(n, (i, j) => (i === j ? 2 : Math.abs(i - j) === 1 ? -1 : 0));
  const m = diagonal(range(n, (i) => (i % 2 === 1 ? 1 : 0)));
  const exact = problemOf(k, m, -0.1);
  const noise = createRandom(8);
  const sloppy: ShiftInvertProblem = {
    ...exact,
    solveInPlace: (b) => {
      exact.solveInPlace(b);
      for (let i = 0; i < b.values.length; i++) if ((i % n) % 2 === 0) b.values[i] += 1e-9 * noise.normal();
    },
  };
  const { vectors } = shiftInvertLanczos(sloppy, {
    ...base,
    lower: 0,
    upper: 1,
    expected: 10,
    blockSize: 1,
    random: createRandom(1),
  });
  const kx = multiply(k, vectors).values;
  let worst = 0;
  for (let i = 0; i < kx.length; i++) if ((i % n) % 2 === 0) worst = Math.max(worst, Math.abs(kx[i]));
  // The noise of one solve, four standard deviations, over θ ≥ 0.9: without purification it grows to 1e-3.
  expect(worst).toBeLessThan(2e-8);
});

it("one eigenvalue of multiplicity n is found n times, the Krylov space ending at every step", () => {
  const n = 12;
  expectModes({
    k: diagonal(range(n, () => 7)),
    m: diagonal(range(n, () => 2)),
    shift: 0,
    wanted: range(n, () => 3.5),
    options: { lower: 3, upper: 4, blockSize: 1 },
  });
});

it("massless degrees of freedom give no infinite eigenvalue and vectors that satisfy the massless rows", () => {
  const n = 60;
  // Every other point of a grounded chain carries mass; eliminating the massless ones halves the
  // stiffness of each link: λ = 2·(1 − cos(kπ/(h + 1)))/2 with h the number of masses.
  const k = matrixOf(n + 1, (i, j) => (i === j ? 2 : Math.abs(i - j) === 1 ? -1 : 0));
  const h = n / 2;
  const m = diagonal(range(n + 1, (i) => (i % 2 === 1 ? 1 : 0)));
  const value = (p: number) => 1 - Math.cos(((p + 1) * Math.PI) / (h + 1));
  expectModes({
    k,
    m,
    shift: -0.1,
    wanted: range(10, value),
    options: { lower: 0, upper: (value(9) + value(10)) / 2 },
  });
  // All of them: the range of M holds no more.
  expectModes({ k, m, shift: -0.1, wanted: range(h, value), options: { lower: 0, upper: 3 } });
});

it("eigenvalues at the very ends of the interval are counted in", () => {
  const values = [2, 3, 4, 5, ...range(40, (k) => 7 + k)];
  expectModes({
    k: diagonal(values),
    m: diagonal(range(44, () => 1)),
    shift: 2.5,
    wanted: [2, 3, 4, 5],
    options: { lower: 2, upper: 5 },
  });
});

it("negative eigenvalues of an indefinite stiffness are found", () => {
  const values = range(50, (k) => k - 4.5);
  expectModes({
    k: diagonal(values),
    m: diagonal(range(50, (i) => 1 + (i % 3))),
    shift: 0.1,
    wanted: values
      .map((x, i) => x / (1 + (i % 3)))
      .filter((x) => x <= 3.2)
      .sort((x, y) => x - y),
    options: { lower: -10, upper: 3.2 },
  });
});

it("nothing is done where nothing is expected", () => {
  const problem = problemOf(diagonal([1, 2]), diagonal([1, 1]), 0);
  const result = shiftInvertLanczos(problem, {
    ...base,
    lower: 5,
    upper: 6,
    expected: 0,
    random: createRandom(1),
  });
  expect(result.status).toBe("complete");
  expect(result.solves).toBe(0);
  expect(result.vectors.cols).toBe(0);
});

it("orders 1 and 2 work with blocks larger than the order", () => {
  expectModes({ k: diagonal([3]), m: diagonal([1]), shift: 0, wanted: [3], options: { lower: 0, upper: 4 } });
  expectModes({
    k: diagonal([3, 8]),
    m: diagonal([1, 2]),
    shift: 0,
    wanted: [3, 4],
    options: { lower: 0, upper: 4, blockSize: 6 },
  });
});

it("too few solves, or more modes expected than there are, end as incomplete with what was found", () => {
  const problem = problemOf(diagonal(range(60, (k) => k + 1)), diagonal(range(60, () => 1)), 0);
  const options = { ...base, lower: 0, upper: 20.5, random: createRandom(1) };
  const short = shiftInvertLanczos(problem, { ...options, expected: 20, maximumSolves: 15 });
  expect(short.status).toBe("incomplete");
  expect(short.solves).toBeLessThanOrEqual(15);
  expect(short.values.length).toBeLessThan(20);
  const many = shiftInvertLanczos(problem, { ...options, expected: 25, maximumSolves: 2000 });
  expect(many.status).toBe("incomplete");
  expect(many.values.length).toBe(20);
});

it("equal seeds give equal bytes", () => {
  const run = () =>
    shiftInvertLanczos(problemOf(chain(40), diagonal(range(40, () => 1)), -0.1), {
      ...base,
      lower: -0.1,
      upper: 0.5,
      expected: 9,
      random: createRandom(3),
    });
  expect(run()).toEqual(run());
});

it("a solve that is not finite is refused", () => {
  const problem: ShiftInvertProblem = {
    order: 3,
    shift: 0,
    applyMassInto: (y, x) => y.set(x),
    solveInPlace: (b) => void b.values.fill(Number.NaN),
  };
  expect(() =>
    shiftInvertLanczos(problem, { ...base, lower: 0, upper: 1, expected: 1, random: createRandom(1) }),
  ).toThrow(expect.objectContaining({ code: "numerics.not-finite" }));
});
