/**
 * Solves of awkward matrices against SciPy. The committed numbers are Σ wᵢ xᵢ for random weights w, with the bound
 * |w·δx| ≤ η·sensitivity that holds for every solution of normwise backward error η.
 */

import { readFileSync } from "node:fs";
import { describe, expect, it } from "vitest";
import type { ComplexMatrix, ComplexVector } from "../../src/numerics/dense/matrix.js";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { factorComplex } from "../../src/numerics/sparse/complex-lu.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";
import { type SolveCase, solveCases, WEIGHTS } from "./sparse-solves-cases.js";

interface Functional {
  readonly re: number;
  readonly im: number;
  readonly sensitivity: number;
}

interface Reference {
  readonly name: string;
  readonly order: number;
  readonly entries: number;
  readonly sums: readonly number[];
  readonly solve: readonly Functional[];
  readonly adjoint: readonly Functional[];
  readonly symmetric: readonly Functional[];
  readonly determinant: { readonly logAbs: number; readonly phase: number; readonly sensitivity: number };
  readonly inertia: { readonly negative: number; readonly positive: number };
}

const file: { cases: Reference[] } = JSON.parse(
  readFileSync(new URL("sparse-solves.json", import.meta.url), "utf8"),
);
const references = new Map(file.cases.map((reference) => [reference.name, reference]));

/** Where solves promise 1e-14; twice that, because SciPy's equilibrated units are not quite ours. */
const BACKWARD_ERROR = 2e-14;
/** Backward error of the factors alone, in entries of the matrix: threshold pivoting lets them grow about a hundredfold. */
const FACTOR_ERROR = 100 * Number.EPSILON;
/** No tolerance may be so wide that it says nothing; the resonant case comes near 1e-3. */
const WIDEST = 1e-2;

const cases = solveCases();

it("has a reference for every case and a case for every reference", () => {
  expect(cases.map((c) => c.name).sort()).toEqual([...references.keys()].sort());
});

describe.each(cases)("$name", (solveCase) => {
  const { name, pattern, dynamic, undamped, right, weights } = solveCase;
  const reference = references.get(name)!;
  const analysis = analyse(pattern);
  const factorisation = factorComplex(analysis, pattern, dynamic);

  it("is the matrix that SciPy was given", () => {
    expect(pattern.cols).toBe(reference.order);
    expect(pattern.rowIndex.length).toBe(reference.entries);
    [dynamic.re, dynamic.im, undamped].forEach((values, k) => {
      const sum = values.reduce((total, v) => total + Math.abs(v), 0);
      // Sums in another order: entries × eps.
      expect(Math.abs(sum - reference.sums[k]!)).toBeLessThanOrEqual(1e-11 * reference.sums[k]!);
    });
  });

  it("is solved as by SciPy", () => {
    const x = copyOf(right);
    const { backwardError } = factorisation.solveInPlace(x);
    expect(backwardError).toBeLessThanOrEqual(1e-14);
    expectFunctionals(solveCase, x, reference.solve);
  });

  it("is solved as by SciPy with the conjugate transpose", () => {
    const x = copyOf(right);
    const { backwardError } = factorisation.solveAdjointInPlace(x);
    expect(backwardError).toBeLessThanOrEqual(1e-14);
    expectFunctionals(solveCase, x, reference.adjoint);
  });

  it("has the determinant that LAPACK finds", () => {
    const { logAbs, phase, sensitivity } = reference.determinant;
    const tolerance = FACTOR_ERROR * sensitivity;
    expect(factorisation.negligiblePivots).toBe(0);
    expect(Math.abs(factorisation.logAbsDet - logAbs)).toBeLessThan(tolerance);
    const turned = (factorisation.phaseDet - phase) / (2 * Math.PI);
    expect(2 * Math.PI * Math.abs(turned - Math.round(turned))).toBeLessThan(tolerance);
  });

  it("without damping has the solution that SciPy and the inertia that LAPACK finds", () => {
    const real = factorSymmetric(analysis, pattern, undamped);
    const { negative, positive } = reference.inertia;
    // Every case is regular, the resonant one by about 1e-8: far above rounding.
    expect(real.inertiaReliable).toBe(true);
    expect(real.inertia).toEqual({ negative, zero: 0, positive });
    const b = { rows: pattern.rows, cols: 1, values: right.re.slice() };
    expect(real.solveInPlace(b).backwardError).toBeLessThanOrEqual(1e-14);
    const zero = new Float64Array(pattern.rows);
    const realWeights = weights.map(({ re }) => ({ re, im: zero }));
    expectFunctionals({ weights: realWeights }, { re: b.values, im: zero }, reference.symmetric);
  });
});

function copyOf({ re, im }: ComplexVector): ComplexMatrix {
  return { rows: re.length, cols: 1, re: re.slice(), im: im.slice() };
}

function expectFunctionals(
  { weights }: Pick<SolveCase, "weights">,
  x: ComplexVector,
  expected: readonly Functional[],
): void {
  expect(expected.length).toBe(WEIGHTS);
  expected.forEach(({ re, im, sensitivity }, k) => {
    const w = weights[k]!;
    let sumRe = 0;
    let sumIm = 0;
    for (let i = 0; i < x.re.length; i++) {
      sumRe += w.re[i]! * x.re[i]! - w.im[i]! * x.im[i]!;
      sumIm += w.re[i]! * x.im[i]! + w.im[i]! * x.re[i]!;
    }
    const tolerance = BACKWARD_ERROR * sensitivity;
    expect(tolerance).toBeLessThan(WIDEST * Math.hypot(re, im));
    expect(Math.hypot(sumRe - re, sumIm - im)).toBeLessThan(tolerance);
  });
}
