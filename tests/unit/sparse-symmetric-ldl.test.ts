import { EigenvalueDecomposition, Matrix } from "ml-matrix";
import { expect, it } from "vitest";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { fromTriplets, multiplyAddInto, type SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";
import { awkwardCase, describeWithEveryKernel, plateCase, tiedPlateCase, uniform } from "./sparse-cases.js";

const seeds = Array.from({ length: 350 }, (_, s) => s + 1);

const factor = (a: SparseMatrix, groups?: Int32Array) => factorSymmetric(analyse(a, groups), a, a.values);

function eigenvalues(a: SparseMatrix): number[] {
  const dense = Matrix.zeros(a.rows, a.cols);
  for (let j = 0; j < a.cols; j++) {
    for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) dense.set(a.rowIndex[p]!, j, a.values[p]!);
  }
  return new EigenvalueDecomposition(dense, { assumeSymmetric: true }).realEigenvalues;
}

function rightSides(n: number, cols: number, seed: number) {
  const random = uniform(seed);
  return { rows: n, cols, values: new Float64Array(n * cols).map(() => 2 * random() - 1) };
}

describeWithEveryKernel("LDLᵀ of awkward random matrices", () => {
  it("solves with a backward error below 1e-14, for one and for many right-hand sides", () => {
    let refinements = 0;
    for (const seed of seeds) {
      const { a, name } = awkwardCase(seed, true);
      const b = rightSides(a.rows, seed % 2 === 0 ? 1 : 9, seed + 999);
      const x = { ...b, values: b.values.slice() };
      const report = factor(a).solveInPlace(x);
      expect(report.backwardError, `${name}, seed ${seed}`).toBeLessThan(1e-14);
      refinements += report.refinements;
      const r = b.values.slice(0, a.rows);
      multiplyAddInto(r, -1, a, x.values.subarray(0, a.rows));
      const largest = (v: Float64Array) => v.reduce((m, y) => Math.max(m, Math.abs(y)), 0);
      const scale = largest(a.values) * a.rows * largest(x.values.subarray(0, a.rows)) + 1;
      expect(largest(r) / scale, `${name}, seed ${seed}`).toBeLessThan(1e-14);
    }
    // Refinement would hide a slightly wrong substitution; threshold pivoting needs it rarely.
    expect(refinements).toBeLessThanOrEqual(3);
  });

  it("counts the signs that the eigenvalues of ml-matrix have", () => {
    for (const seed of seeds) {
      const { a, name } = awkwardCase(seed, true);
      // Eigenvalues of the badly scaled ones are not known to their sign; a congruence keeps the inertia.
      if (name.startsWith("scales")) continue;
      const all = eigenvalues(a);
      const { inertia, inertiaReliable } = factor(a);
      expect(inertiaReliable, `${name}, seed ${seed}`).toBe(true);
      expect(inertia, `${name}, seed ${seed}`).toEqual({
        negative: all.filter((e) => e < 0).length,
        zero: 0,
        positive: all.filter((e) => e > 0).length,
      });
    }
  });

  it("gives the same inertia after a congruence with wild scales", () => {
    for (const seed of seeds) {
      const { a, name } = awkwardCase(seed, true);
      if (name.startsWith("scales")) continue;
      const random = uniform(seed + 5);
      const scale = Array.from({ length: a.cols }, () => 10 ** (10 * random() - 5));
      const values = a.values.slice();
      for (let j = 0; j < a.cols; j++) {
        for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
          values[p] = values[p]! * scale[j]! * scale[a.rowIndex[p]!]!;
        }
      }
      expect(factor({ ...a, values }).inertia, `${name}, seed ${seed}`).toEqual(factor(a).inertia);
    }
  });
});

describeWithEveryKernel("LDLᵀ of degenerate matrices", () => {
  it("takes an empty matrix", () => {
    expect(factor(fromTriplets(0, 0, [], [], [])).inertia).toEqual({ negative: 0, zero: 0, positive: 0 });
  });

  it("takes a matrix of order one", () => {
    const factorisation = factor(fromTriplets(1, 1, [0], [0], [-4]));
    const b = { rows: 1, cols: 1, values: Float64Array.of(2) };
    factorisation.solveInPlace(b);
    expect(b.values[0]).toBe(-0.5);
    expect(factorisation.inertia).toEqual({ negative: 1, zero: 0, positive: 0 });
  });

  it("counts the zeros of a zero matrix and calls the counts unreliable", () => {
    const factorisation = factor(fromTriplets(3, 3, [0, 1, 2], [0, 1, 2], [0, 0, 0]));
    expect(factorisation.inertia).toEqual({ negative: 0, zero: 3, positive: 0 });
    expect(factorisation.inertiaReliable).toBe(false);
  });

  it("finds the free motion of an unsupported chain and calls the counts unreliable", () => {
    const n = 40;
    const index = Array.from({ length: n }, (_, i) => i);
    const rows = [...index, ...index.slice(1), ...index.slice(0, -1)];
    const cols = [...index, ...index.slice(0, -1), ...index.slice(1)];
    const values = rows.map((i, t) => (i !== cols[t] ? -1 : i === 0 || i === n - 1 ? 1 : 2));
    const factorisation = factor(fromTriplets(n, n, rows, cols, values));
    expect(factorisation.inertia).toEqual({ negative: 0, zero: 1, positive: n - 1 });
    expect(factorisation.inertiaReliable).toBe(false);
  });

  it("refuses values that are not finite, with code numerics.not-finite", () => {
    const bad = fromTriplets(1, 1, [0], [0], [Number.NaN]);
    expect(() => factor(bad)).toThrow(expect.objectContaining({ code: "numerics.not-finite" }));
  });
});

describeWithEveryKernel("LDLᵀ of a plate", () => {
  it("solves 10 092 dofs with a backward error below 1e-14", () => {
    const { a, groups } = plateCase(58, 3);
    const b = rightSides(a.rows, 3, 4);
    expect(factor(a, groups).solveInPlace(b).backwardError).toBeLessThan(1e-14);
  });

  it("counts one negative eigenvalue for every tie between dofs of a positive definite plate", () => {
    const { a } = tiedPlateCase(30, 400);
    const factorisation = factor(a);
    expect(factorisation.inertia).toEqual({ negative: 400, zero: 0, positive: 2700 });
    expect(factorisation.inertiaReliable).toBe(true);
    expect(factorisation.solveInPlace(rightSides(a.rows, 3, 4)).backwardError).toBeLessThan(1e-14);
  });

  it("counts the eigenvalues below a shift like ml-matrix on a small plate", () => {
    const { a, groups } = plateCase(5, 3);
    const unit = Float64Array.from({ length: a.cols }, (_, i) => (i % 3 === 0 ? 1e-5 : 1));
    const values = a.values.slice();
    for (let j = 0; j < a.cols; j++) {
      for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
        values[p] = values[p]! * unit[j]! * unit[a.rowIndex[p]!]! - (a.rowIndex[p] === j ? 0.9 : 0);
      }
    }
    const shifted = { ...a, values };
    const below = eigenvalues(shifted).filter((e) => e < 0).length;
    expect(below).toBeGreaterThan(10);
    expect(below).toBeLessThan(65);
    expect(factor(shifted, groups).inertia.negative).toBe(below);
  });
});

describeWithEveryKernel("a released LDLᵀ", () => {
  it("refuses to solve, and the one that takes its memory is right", () => {
    const { a, groups } = plateCase(12, 3);
    const first = factor(a, groups);
    const b = rightSides(a.rows, 2, 3);
    const copy = () => ({ ...b, values: b.values.slice() });
    const x = copy();
    first.solveInPlace(x);
    first.release();
    expect(() => first.solveInPlace(copy())).toThrow(/released/);
    const y = copy();
    factor(a, groups).solveInPlace(y);
    expect(y).toEqual(x);
  });
});
