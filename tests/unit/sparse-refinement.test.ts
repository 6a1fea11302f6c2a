import { describe, expect, it } from "vitest";
import { ComplexRefinement } from "../../src/numerics/sparse/complex-refinement.js";
import { RealRefinement } from "../../src/numerics/sparse/real-refinement.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";

// diag(1e20, 1): in the given units the second row cannot be seen beside the first.
const a = fromTriplets(2, 2, [0, 1], [0, 1], [1e20, 1]);
const scale = Float64Array.of(2 ** -33, 1);
const norms = {
  given: { plain: 1e20, adjoint: 1e20 },
  scaled: { plain: 1e20 * 2 ** -66, adjoint: 1e20 * 2 ** -66 },
};

/** A solve whose second component carries this relative error. */
const realSolve = (error: number) => (x: { cols: number; values: Float64Array }) => {
  for (let c = 0; c < x.cols; c++) {
    x.values[2 * c] = x.values[2 * c]! / 1e20;
    x.values[2 * c + 1] = x.values[2 * c + 1]! * (1 + error);
  }
};
const complexSolve =
  (error: number) =>
  ({ cols, re, im }: { cols: number; re: Float64Array; im: Float64Array }) => {
    realSolve(error)({ cols, values: re });
    realSolve(error)({ cols, values: im });
  };

describe("iterative refinement", () => {
  it("repairs a solve with an error of one in a thousand, column by column", () => {
    const b = { rows: 2, cols: 3, values: Float64Array.of(1e10, 1, 1e10, 0, 2e10, 3) };
    const report = new RealRefinement(a, scale).solve(b, realSolve(0.001));
    expect(report.refinements).toBeGreaterThan(2);
    expect(report.backwardError).toBeLessThan(1e-14);
    // Five corrections leave rounding only.
    expect(b.values[1]).toBeCloseTo(1, 13);
    expect(b.values[5]).toBeCloseTo(3, 13);
  });

  it("repairs complex solves alike", () => {
    const b = { rows: 2, cols: 1, re: Float64Array.of(1e10, 1), im: Float64Array.of(0, -2) };
    for (const adjoint of [false, true]) {
      const x = { ...b, re: b.re.slice(), im: b.im.slice() };
      const report = new ComplexRefinement(a, { re: a.values, im: new Float64Array(2) }, scale, norms).solve(
        x,
        adjoint,
        complexSolve(0.001),
      );
      expect(report.refinements).toBeGreaterThan(2);
      expect(report.backwardError).toBeLessThan(1e-14);
      expect(x.im[1]).toBeCloseTo(-2, 13);
    }
  });

  it("reports the error of rows that the stiffest row hides, after giving up", () => {
    const b = { rows: 2, cols: 1, values: Float64Array.of(1e10, 1) };
    // Corrections of three times the residual make matters worse: the first solution stays.
    const report = new RealRefinement(a, scale).solve(b, realSolve(3));
    expect(report.backwardError).toBeGreaterThan(0.1);
    expect(report.refinements).toBe(1);
    expect(b.values[1]).toBe(4);
    const c = { rows: 2, cols: 1, re: Float64Array.of(1e10, 1), im: new Float64Array(2) };
    const complex = new ComplexRefinement(a, { re: a.values, im: new Float64Array(2) }, scale, norms);
    expect(complex.solve(c, false, complexSolve(3)).backwardError).toBeGreaterThan(0.1);
  });
});
