import { expect, it } from "vitest";
import type { ComplexMatrix } from "../../src/numerics/dense/matrix.js";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { factorComplex } from "../../src/numerics/sparse/complex-lu.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";
import {
  awkwardCase,
  describeWithEveryKernel,
  plateCase,
  type SparseCase,
  tiedPlateCase,
  uniform,
} from "./sparse-cases.js";

type Complex = [number, number];
const times = ([a, b]: Complex, [c, d]: Complex): Complex => [a * c - b * d, a * d + b * c];
const minus = ([a, b]: Complex, [c, d]: Complex): Complex => [a - c, b - d];
const over = ([a, b]: Complex, [c, d]: Complex): Complex => {
  const q = c * c + d * d;
  return [(a * c + b * d) / q, (b * c - a * d) / q];
};

function denseOf({ a, im }: SparseCase): Complex[][] {
  const dense = Array.from({ length: a.rows }, () => Array.from({ length: a.cols }, (): Complex => [0, 0]));
  for (let j = 0; j < a.cols; j++) {
    for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
      dense[a.rowIndex[p]!]![j] = [a.values[p]!, im[p]!];
    }
  }
  return dense;
}

/** Gaussian elimination with partial pivoting, rows by rows: solution, ln |det| and arg det. */
function denseSolve(matrix: Complex[][], right: Complex[]): { x: Complex[]; logAbs: number; phase: number } {
  const n = matrix.length;
  const w = matrix.map((row, i) => [...row, right[i]!]);
  let logAbs = 0;
  let phase = 0;
  for (let k = 0; k < n; k++) {
    let best = k;
    for (let i = k; i < n; i++) if (Math.hypot(...w[i]![k]!) > Math.hypot(...w[best]![k]!)) best = i;
    if (best !== k) {
      [w[k], w[best]] = [w[best]!, w[k]!];
      phase += Math.PI;
    }
    const pivot = w[k]![k]!;
    logAbs += Math.log(Math.hypot(...pivot));
    phase += Math.atan2(pivot[1], pivot[0]);
    for (let i = k + 1; i < n; i++) {
      const l = over(w[i]![k]!, pivot);
      for (let j = k; j <= n; j++) w[i]![j] = minus(w[i]![j]!, times(l, w[k]![j]!));
    }
  }
  const x: Complex[] = new Array<Complex>(n);
  for (let i = n - 1; i >= 0; i--) {
    let sum = w[i]![n]!;
    for (let j = i + 1; j < n; j++) sum = minus(sum, times(w[i]![j]!, x[j]!));
    x[i] = over(sum, w[i]![i]!);
  }
  return { x, logAbs, phase };
}

function rightSides(n: number, cols: number, random: () => number): ComplexMatrix {
  const re = new Float64Array(n * cols).map(() => 2 * random() - 1);
  const im = new Float64Array(n * cols).map(() => 2 * random() - 1);
  return { rows: n, cols, re, im };
}

const copy = (b: ComplexMatrix): ComplexMatrix => ({ ...b, re: b.re.slice(), im: b.im.slice() });

function factorCase(problem: SparseCase, groups?: Int32Array) {
  const { a, im } = problem;
  return factorComplex(analyse(a, groups), a, { re: a.values, im });
}

/** ‖b − A x‖∞ / (‖A‖∞ ‖x‖∞ + ‖b‖∞) of one column, from dense products. */
function denseBackwardError(matrix: Complex[][], x: ComplexMatrix, b: ComplexMatrix, c: number): number {
  const n = matrix.length;
  let residual = 0;
  let normA = 0;
  let normX = 0;
  let normB = 0;
  for (let i = 0; i < n; i++) {
    let r: Complex = [b.re[i + c * n]!, b.im[i + c * n]!];
    normB = Math.max(normB, Math.hypot(...r));
    normX = Math.max(normX, Math.hypot(x.re[i + c * n]!, x.im[i + c * n]!));
    let sum = 0;
    for (let j = 0; j < n; j++) {
      r = minus(r, times(matrix[i]![j]!, [x.re[j + c * n]!, x.im[j + c * n]!]));
      sum += Math.hypot(...matrix[i]![j]!);
    }
    residual = Math.max(residual, Math.hypot(...r));
    normA = Math.max(normA, sum);
  }
  return residual === 0 ? 0 : residual / (normA * normX + normB);
}

const adjointOf = (matrix: Complex[][]): Complex[][] =>
  matrix.map((_, i) => matrix.map((row): Complex => [row[i]![0], -row[i]![1]]));

describeWithEveryKernel("complex LU of awkward random matrices", () => {
  const seeds = Array.from({ length: 350 }, (_, s) => s + 1);

  it("solves with a backward error below 1e-14, for one and for many right-hand sides", () => {
    let refinements = 0;
    for (const seed of seeds) {
      const problem = awkwardCase(seed, false);
      const dense = denseOf(problem);
      const b = rightSides(problem.a.rows, seed % 2 === 0 ? 1 : 9, uniform(seed + 9999));
      const x = copy(b);
      const report = factorCase(problem).solveInPlace(x);
      let worst = 0;
      for (let c = 0; c < b.cols; c++) worst = Math.max(worst, denseBackwardError(dense, x, b, c));
      // 1e-14 is the goal of refinement; the dense sums of up to 46 terms round a little differently.
      expect(worst, `${problem.name}, seed ${seed}`).toBeLessThan(2e-14);
      expect(report.backwardError, `${problem.name}, seed ${seed}`).toBeLessThan(1e-14);
      refinements += report.refinements;
    }
    // Refinement would hide a slightly wrong substitution; threshold pivoting needs it rarely.
    expect(refinements).toBeLessThanOrEqual(3);
  });

  it("solves with the conjugate transpose as well", () => {
    let refinements = 0;
    for (const seed of seeds) {
      const problem = awkwardCase(seed, false);
      const dense = adjointOf(denseOf(problem));
      const b = rightSides(problem.a.rows, seed % 2 === 0 ? 2 : 5, uniform(seed + 777));
      const x = copy(b);
      const report = factorCase(problem).solveAdjointInPlace(x);
      let worst = 0;
      for (let c = 0; c < b.cols; c++) worst = Math.max(worst, denseBackwardError(dense, x, b, c));
      expect(worst, `${problem.name}, seed ${seed}`).toBeLessThan(2e-14);
      expect(report.backwardError, `${problem.name}, seed ${seed}`).toBeLessThan(1e-14);
      refinements += report.refinements;
    }
    // Refinement would hide a slightly wrong substitution; threshold pivoting needs it rarely.
    expect(refinements).toBeLessThanOrEqual(3);
  });

  it("agrees with dense elimination in solution and determinant", () => {
    for (const seed of seeds) {
      const problem = awkwardCase(seed, false);
      if (problem.name.startsWith("scales")) continue;
      const b = rightSides(problem.a.rows, 1, uniform(seed + 31));
      const right = Array.from(b.re, (re, i): Complex => [re, b.im[i]!]);
      const dense = denseSolve(denseOf(problem), right);
      const factorisation = factorCase(problem);
      const x = copy(b);
      factorisation.solveInPlace(x);
      const scale = Math.max(...dense.x.map((v) => Math.hypot(...v)));
      dense.x.forEach((value, i) => {
        // Random matrices of order 46 have condition numbers up to about 1e6.
        expect(Math.hypot(x.re[i]! - value[0], x.im[i]! - value[1]) / scale, `seed ${seed}`).toBeLessThan(
          1e-9,
        );
      });
      expect(Math.abs(factorisation.logAbsDet - dense.logAbs), `seed ${seed}`).toBeLessThan(1e-9);
      expect(Math.cos(factorisation.phaseDet - dense.phase), `seed ${seed}`).toBeGreaterThan(1 - 1e-12);
      expect(Math.abs(factorisation.phaseDet)).toBeLessThanOrEqual(Math.PI);
    }
  });
});

const single = (re: number, im: number) =>
  factorComplex(analyse(fromTriplets(1, 1, [0], [0], [1])), fromTriplets(1, 1, [0], [0], [1]), {
    re: Float64Array.of(re),
    im: Float64Array.of(im),
  });

describeWithEveryKernel("complex LU of degenerate matrices", () => {
  it("takes an empty matrix", () => {
    const empty = fromTriplets(0, 0, [], [], []);
    const factorisation = factorComplex(analyse(empty), empty, {
      re: new Float64Array(0),
      im: new Float64Array(0),
    });
    expect(factorisation.logAbsDet).toBe(0);
    const b = rightSides(0, 2, uniform(1));
    expect(factorisation.solveInPlace(b).backwardError).toBe(0);
  });

  it("divides by a matrix of order one", () => {
    const b = { rows: 1, cols: 1, re: Float64Array.of(5), im: Float64Array.of(0) };
    const factorisation = single(3, 4);
    factorisation.solveInPlace(b);
    expect(b.re[0]).toBeCloseTo(0.6, 15);
    expect(b.im[0]).toBeCloseTo(-0.8, 15);
    expect(factorisation.logAbsDet).toBeCloseTo(Math.log(5), 14);
    expect(factorisation.phaseDet).toBeCloseTo(Math.atan2(4, 3), 14);
  });

  it("replaces the pivot of a zero matrix and gives a finite solution with its error", () => {
    const factorisation = single(0, 0);
    const b = { rows: 1, cols: 1, re: Float64Array.of(1), im: Float64Array.of(0) };
    const report = factorisation.solveInPlace(b);
    expect(factorisation.negligiblePivots).toBe(1);
    expect(Number.isFinite(b.re[0])).toBe(true);
    expect(report.backwardError).toBe(1);
  });

  it("gives the null vector of a matrix that is singular exactly", () => {
    // The chain of three springs without support: constant vectors are its null space.
    const a = fromTriplets(3, 3, [0, 0, 1, 1, 1, 2, 2], [0, 1, 0, 1, 2, 1, 2], [1, -1, -1, 2, -1, -1, 1]);
    const factorisation = factorComplex(analyse(a), a, { re: a.values, im: new Float64Array(7) });
    const b = { rows: 3, cols: 1, re: Float64Array.of(1, 0.5, 0.25), im: new Float64Array(3) };
    const report = factorisation.solveInPlace(b);
    expect(factorisation.negligiblePivots).toBe(1);
    expect(Math.abs(b.re[0]!)).toBeGreaterThan(1e12);
    expect(b.re[1]! / b.re[0]!).toBeCloseTo(1, 12);
    expect(b.re[2]! / b.re[0]!).toBeCloseTo(1, 12);
    expect(report.backwardError).toBeLessThan(1e-14);
  });

  it("counts one replaced pivot for every dof without any entry", () => {
    const a = fromTriplets(5, 5, [0, 1, 2, 3, 4, 0, 4], [0, 1, 2, 3, 4, 4, 0], [2, 0, 0, 0, 2, 1, 1]);
    const factorisation = factorComplex(analyse(a), a, { re: a.values, im: new Float64Array(7) });
    expect(factorisation.negligiblePivots).toBe(3);
    const b = { rows: 5, cols: 1, re: Float64Array.of(3, 0, 0, 0, 3), im: new Float64Array(5) };
    factorisation.solveInPlace(b);
    expect(Array.from(b.re)).toEqual([1, 0, 0, 0, 1]);
  });

  it("replaces the pivots of empty dofs on the spot instead of carrying them to the root", () => {
    const { a, im } = plateCase(20, 2);
    const values = { re: a.values.slice(), im: im.slice() };
    for (let j = 0; j < a.cols; j++) {
      for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
        if (j % 3 !== 0 && a.rowIndex[p]! % 3 !== 0) continue;
        values.re[p] = 0;
        values.im[p] = 0;
      }
    }
    const analysis = analyse(a);
    const factorisation = factorComplex(analysis, a, values);
    expect(factorisation.negligiblePivots).toBe(400);
    expect(factorisation.nonzeros).toBe(analysis.predictedNonzeros);
  });

  it("refuses values that are not finite, with code numerics.not-finite", () => {
    expect(() => single(Number.NaN, 0)).toThrow(expect.objectContaining({ code: "numerics.not-finite" }));
  });

  it("reports a right-hand side that is not finite with code numerics.singular", () => {
    const b = { rows: 1, cols: 1, re: Float64Array.of(Number.POSITIVE_INFINITY), im: Float64Array.of(0) };
    expect(() => single(1, 0).solveInPlace(b)).toThrow(
      expect.objectContaining({ code: "numerics.singular" }),
    );
  });

  it("solves an arrow of order 3000 without filling it", () => {
    const n = 3000;
    const index = Array.from({ length: n }, (_, i) => i);
    const others = index.slice(1);
    const rows = [...index, ...others.map(() => 0), ...others];
    const cols = [...index, ...others, ...others.map(() => 0)];
    const a = fromTriplets(
      n,
      n,
      rows,
      cols,
      rows.map((i, t) => (i === cols[t] ? 3 : 1 / n)),
    );
    const factorisation = factorComplex(analyse(a), a, {
      re: a.values,
      im: new Float64Array(a.values.length),
    });
    const b = rightSides(n, 1, uniform(5));
    expect(factorisation.solveInPlace(b).backwardError).toBeLessThan(1e-14);
    // Exactly 3n − 2 without amalgamation, which may at most double it.
    expect(factorisation.nonzeros).toBeLessThan(8 * n);
  });
});

describeWithEveryKernel("complex LU of a plate with 2700 dofs and 400 ties", () => {
  it("delays pivots of the ties to later fronts and keeps the backward error below 1e-14", () => {
    const { a, im } = tiedPlateCase(30, 400);
    const analysis = analyse(a);
    const factorisation = factorComplex(analysis, a, { re: a.values, im });
    expect(factorisation.negligiblePivots).toBe(0);
    expect(factorisation.nonzeros).toBeGreaterThan(analysis.predictedNonzeros);
    expect(factorisation.nonzeros).toBeLessThan(1.1 * analysis.predictedNonzeros);
    const b = rightSides(a.rows, 2, uniform(8));
    expect(factorisation.solveInPlace(copy(b)).backwardError).toBeLessThan(1e-14);
    expect(factorisation.solveAdjointInPlace(copy(b)).backwardError).toBeLessThan(1e-14);
  });
});

describeWithEveryKernel("complex LU of a plate with 10 092 dofs", () => {
  it("stays within 2.2 million entries and solves both ways with a backward error below 1e-14", () => {
    const problem = plateCase(58, 3);
    const factorisation = factorCase(problem, problem.groups);
    expect(factorisation.negligiblePivots).toBe(0);
    expect(factorisation.nonzeros).toBeLessThan(2.2e6);
    const b = rightSides(problem.a.rows, 6, uniform(8));
    expect(factorisation.solveInPlace(copy(b)).backwardError).toBeLessThan(1e-14);
    expect(factorisation.solveAdjointInPlace(copy(b)).backwardError).toBeLessThan(1e-14);
  });
});

describeWithEveryKernel("complex LU of a lightly damped membrane at a resonance", () => {
  // The square grid's modes are products of sines, so that P(iω_m)⁻¹ φ = φ / (i η λ_m) is known.
  const side = 36;
  const mode = 3;
  const angle = (mode * Math.PI) / (side + 1);
  const lambda = 4 - 4 * Math.cos(angle);
  const phi = Float64Array.from({ length: side * side }, (_, k) => {
    const i = k % side;
    const j = (k - i) / side;
    return Math.sin(angle * (i + 1)) * Math.sin(angle * (j + 1));
  });
  const triplets: [number, number, number][] = [];
  for (let k = 0; k < side * side; k++) {
    triplets.push([k, k, 4]);
    if (k % side > 0) triplets.push([k, k - 1, -1], [k - 1, k, -1]);
    if (k >= side) triplets.push([k, k - side, -1], [k - side, k, -1]);
  }
  const order = side * side;
  const stiffness = fromTriplets(
    order,
    order,
    triplets.map((t) => t[0]),
    triplets.map((t) => t[1]),
    triplets.map((t) => t[2]),
  );

  it.each([1e-4, 1e-6, 1e-8])("keeps the height of the peak with a loss factor of %s", (loss) => {
    const { cols, colStart, rowIndex } = stiffness;
    const re = stiffness.values.slice();
    for (let j = 0; j < cols; j++) {
      for (let p = colStart[j]!; p < colStart[j + 1]!; p++) if (rowIndex[p] === j) re[p]! -= lambda;
    }
    const im = stiffness.values.map((k) => loss * k);
    const factor = factorComplex(analyse(stiffness), stiffness, { re, im });
    const x: ComplexMatrix = { rows: order, cols: 1, re: phi.slice(), im: new Float64Array(order) };
    factor.solveInPlace(x);
    const length = Math.hypot(...x.re, ...x.im);
    // Rounding of the real part turns the phase by some eps ‖K‖ / (η λ), which changes the length to second order
    // only; rounding of the same size in the imaginary part would change it to first order, by up to 1e-6 here.
    const turn = (100 * Number.EPSILON * 8) / (loss * lambda);
    expect(Math.abs((length * loss * lambda) / Math.hypot(...phi) - 1)).toBeLessThan(1e-11 + turn * turn);
  });
});

describeWithEveryKernel("a released complex LU", () => {
  it("refuses to solve, and the one that takes its memory is right", () => {
    const problem = plateCase(12, 3);
    const first = factorCase(problem, problem.groups);
    const b = rightSides(problem.a.rows, 2, uniform(3));
    const x = copy(b);
    first.solveInPlace(x);
    first.release();
    expect(() => first.solveInPlace(copy(b))).toThrow(/released/);
    expect(() => first.logAbsDet).toThrow(/released/);
    // Twice, so that an array given back twice would be shared.
    first.release();
    const [second, third] = [factorCase(problem, problem.groups), factorCase(problem, problem.groups)];
    for (const again of [second, third]) {
      const y = copy(b);
      expect(again.solveInPlace(y).backwardError).toBeLessThan(1e-14);
      expect(y).toEqual(x);
    }
  });
});

describeWithEveryKernel("complex LU in units whose squares no double holds", () => {
  it.each([1e-100, 1e160, 1e200])("tells the backward error of entries of size %s", (size) => {
    const rows = [0, 1, 2, 0, 1, 1, 2];
    const cols = [0, 1, 2, 1, 0, 2, 1];
    const numbers = [2, 3, 4, 1, 1, -1, -1];
    const solved = [1, size].map((unit) => {
      const re = numbers.map((value) => value * unit);
      const a = fromTriplets(3, 3, rows, cols, re);
      const factor = factorComplex(analyse(a), a, { re: a.values, im: a.values.map((value) => 0.1 * value) });
      expect(factor.negligiblePivots).toBe(0);
      const x = { rows: 3, cols: 1, re: Float64Array.of(1, 2, 3), im: new Float64Array(3) };
      const { backwardError } = factor.solveInPlace(x);
      expect(backwardError).toBeGreaterThan(0);
      expect(backwardError).toBeLessThan(1e-15);
      return x.re[2]! * unit;
    });
    expect(solved[1]! / solved[0]!).toBeCloseTo(1, 14);
  });
});
