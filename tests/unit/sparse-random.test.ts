/** Answered correctly or refused, never silently wrong: hundreds of awkward small matrices against dense algebra. */

import { EigenvalueDecomposition, Matrix } from "ml-matrix";
import { afterAll, beforeAll, describe, expect, it } from "vitest";
import { type ComplexMatrix, complexZeros } from "../../src/numerics/dense/matrix.js";
import { KERNEL_NAMES } from "../../src/numerics/kernels/kernel.js";
import { useKernel } from "../../src/numerics/kernels/workspace.js";
import { createRandom } from "../../src/numerics/random.js";
import { analyse, type SymbolicAnalysis } from "../../src/numerics/sparse/analysis.js";
import { factorComplex, type SolveReport } from "../../src/numerics/sparse/complex-lu.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";
import {
  adjointOf,
  type DenseReference,
  denseOf,
  denseReference,
  exactBackwardError,
  scaledRows,
} from "./dense-reference.js";
import { type RandomCase, randomCase } from "./sparse-random-cases.js";

/** A case with what every kernel is compared with. */
interface PreparedCase extends RandomCase {
  readonly analysis: SymbolicAnalysis;
  readonly reference: DenseReference;
  readonly symmetricReference: DenseReference;
  /** Of the symmetric matrix, in the units of its reference. */
  readonly eigenvalues: readonly number[];
}

const cases = Array.from({ length: 400 }, (_, s) => prepare(randomCase(s + 1)));
const EPS = Number.EPSILON;
/** What solves promise. */
const GOAL = 1e-14;
/** The solver's equilibrated units differ from the reference's by small powers of two; 1 is the most that was seen. */
const UNITS = 3;
/** Matrices of smaller condition number must be answered; the rest may be refused. */
const CERTAIN = 1e10;
/** Beyond this condition number no digit of a solution means anything. */
const HOPELESS = 1e13;

describe.each(KERNEL_NAMES)("kernel %s", (kernel) => {
  beforeAll(() => useKernel(kernel));
  afterAll(() => useKernel());

  it.each([false, true])("solves correctly or refuses (conjugate transpose: %s)", (adjoint) => {
    let answered = 0;
    for (const one of cases) {
      const { pattern, complex, name, reference } = one;
      const dense = denseOf(pattern, complex);
      const factorisation = factorComplex(one.analysis, pattern, complex);
      const given = rightSides(one, reference);
      const x = copyOf(given);
      const report = adjoint ? factorisation.solveAdjointInPlace(x) : factorisation.solveInPlace(x);
      expectTruthful(name, report, adjoint ? adjointOf(dense) : dense, x, given);
      const claims = factorisation.negligiblePivots === 0 && report.backwardError <= GOAL;
      if (claims) expectNear(name, reference, x, given, adjoint);
      if (reference.condition < CERTAIN) expect(claims, `${name}: answered`).toBe(true);
      answered += claims ? 1 : 0;
    }
    expect(answered).toBeGreaterThan(300);
  });

  it("names every exactly singular matrix singular", () => {
    const singular = cases.filter((one) => one.singular);
    const named = singular.filter(
      ({ analysis, pattern, complex }) => factorComplex(analysis, pattern, complex).negligiblePivots > 0,
    );
    expect(singular.length).toBeGreaterThan(40);
    expect(named.length).toBe(singular.length);
  });

  it("gives the determinant of dense elimination", () => {
    let compared = 0;
    for (const { analysis, pattern, complex, name, reference } of cases) {
      if (reference.condition > CERTAIN) continue;
      const { logAbsDet, phaseDet } = factorComplex(analysis, pattern, complex);
      // Backward errors of the factors of both sides, a few eps of ‖C‖ in every entry.
      const tolerance = 5 * EPS * reference.determinantSensitivity;
      const scaling = reference.scale.reduce((sum, s) => sum + Math.log(s), 0);
      const summation = 4 * reference.order * EPS * Math.max(1, Math.abs(scaling));
      const expected = reference.lu.logAbsDet - 2 * scaling;
      expect(Math.abs(logAbsDet - expected), `${name}: modulus`).toBeLessThanOrEqual(tolerance + summation);
      const turns = (phaseDet - reference.lu.phaseDet) / (2 * Math.PI);
      const turned = 2 * Math.PI * Math.abs(turns - Math.round(turns));
      expect(turned, `${name}: phase`).toBeLessThanOrEqual(tolerance + summation);
      compared++;
    }
    expect(compared).toBeGreaterThan(300);
  });

  it("solves real symmetric ones correctly or refuses", () => {
    let answered = 0;
    for (const one of cases) {
      const { pattern, symmetric, name, symmetricReference: reference } = one;
      const factorisation = factorSymmetric(one.analysis, pattern, symmetric);
      const complexGiven = rightSides(one, reference);
      const given = { ...complexGiven, im: new Float64Array(complexGiven.im.length) };
      const x = copyOf(given);
      const report = factorisation.solveInPlace({ rows: x.rows, cols: x.cols, values: x.re });
      const dense = denseOf(pattern, { re: symmetric, im: new Float64Array(symmetric.length) });
      expectTruthful(name, report, dense, x, given);
      const claims = factorisation.inertiaReliable && report.backwardError <= GOAL;
      if (claims) expectNear(name, reference, x, given, false);
      if (reference.condition < CERTAIN) expect(claims, `${name}: answered`).toBe(true);
      answered += claims ? 1 : 0;
    }
    expect(answered).toBeGreaterThan(250);
  });

  it("counts the eigenvalues that ml-matrix finds or calls its counts unreliable", () => {
    let reliable = 0;
    for (const { analysis, pattern, symmetric, name, singular, eigenvalues } of cases) {
      const largest = Math.max(...eigenvalues.map(Math.abs));
      const smallest = Math.min(...eigenvalues.map(Math.abs));
      const { inertia, inertiaReliable } = factorSymmetric(analysis, pattern, symmetric);
      expect(inertia.negative + inertia.zero + inertia.positive, name).toBe(pattern.cols);
      if (singular) expect(inertiaReliable, `${name}: not reliable`).toBe(false);
      if (smallest > largest / CERTAIN) expect(inertiaReliable, `${name}: reliable`).toBe(true);
      // Signs of eigenvalues below n eps of the largest are noise, of the reference too.
      if (smallest <= 10 * pattern.cols * EPS * largest || !inertiaReliable) continue;
      reliable++;
      expect(inertia, name).toEqual({
        negative: eigenvalues.filter((e) => e < 0).length,
        zero: 0,
        positive: eigenvalues.filter((e) => e > 0).length,
      });
    }
    expect(reliable).toBeGreaterThan(300);
  });
});

function prepare(one: RandomCase): PreparedCase {
  const { pattern, complex, symmetric } = one;
  const reference = denseReference(pattern, complex);
  const symmetricReference = denseReference(pattern, {
    re: symmetric,
    im: new Float64Array(symmetric.length),
  });
  const dense = Matrix.from1DArray(pattern.cols, pattern.cols, symmetricReference.c.re);
  const eigenvalues = new EigenvalueDecomposition(dense, { assumeSymmetric: true }).realEigenvalues;
  return { ...one, analysis: analyse(pattern), reference, symmetricReference, eigenvalues };
}

/** Three columns: alike in the reference's units, alike in the given ones, and A times a vector of ones. */
function rightSides({ pattern, complex }: RandomCase, { scale }: DenseReference): ComplexMatrix {
  const n = pattern.rows;
  const random = createRandom(n);
  const b = complexZeros(n, 3);
  for (let i = 0; i < n; i++) {
    b.re[i] = (2 * random.uniform() - 1) / scale[i]!;
    b.im[i] = (2 * random.uniform() - 1) / scale[i]!;
    b.re[i + n] = 2 * random.uniform() - 1;
    b.im[i + n] = 2 * random.uniform() - 1;
  }
  for (let p = 0; p < pattern.rowIndex.length; p++) {
    b.re[pattern.rowIndex[p]! + 2 * n]! += complex.re[p]!;
    b.im[pattern.rowIndex[p]! + 2 * n]! += complex.im[p]!;
  }
  return b;
}

/** The backward error reported is that of the solution handed out, up to the rounding of its residual. */
function expectTruthful(
  name: string,
  { backwardError }: SolveReport,
  a: ComplexMatrix,
  x: ComplexMatrix,
  b: ComplexMatrix,
): void {
  const rounding = (a.rows + 4) * EPS;
  expect(exactBackwardError(a, x, b), `${name}: reported ${backwardError}`).toBeLessThanOrEqual(
    1.001 * backwardError + rounding,
  );
}

/** |y − ŷ| ≤ condition × backward errors of both solutions, for y = E⁻¹ x in the units of the reference. */
function expectNear(
  name: string,
  { c, lu, scale, norm, condition }: DenseReference,
  x: ComplexMatrix,
  b: ComplexMatrix,
  adjoint: boolean,
): void {
  const n = c.rows;
  const y = scaledRows(x, (i) => 1 / scale[i]!);
  const right = scaledRows(b, (i) => scale[i]!);
  expect(exactBackwardError(adjoint ? adjointOf(c) : c, y, right), name).toBeLessThanOrEqual(UNITS * GOAL);
  if (condition > HOPELESS) return;
  const expected = copyOf(right);
  if (adjoint) lu.solveAdjointInPlace(expected);
  else lu.solveInPlace(expected);
  for (let k = 0; k < b.cols; k++) {
    const largest = (m: ComplexMatrix): number => {
      let most = 0;
      for (let i = k * n; i < (k + 1) * n; i++) most = Math.max(most, Math.hypot(m.re[i]!, m.im[i]!));
      return most;
    };
    const difference = {
      ...y,
      re: y.re.map((v, i) => v - expected.re[i]!),
      im: y.im.map((v, i) => v - expected.im[i]!),
    };
    const scaleOfError = largest(expected) + largest(right) / norm;
    // Partial pivoting leaves the reference a backward error of n eps at most, usually far less.
    const bothErrors = UNITS * GOAL + n * EPS;
    expect(largest(difference), `${name}, column ${k}`).toBeLessThanOrEqual(
      bothErrors * condition * scaleOfError,
    );
  }
}

function copyOf(b: ComplexMatrix): ComplexMatrix {
  return { ...b, re: b.re.slice(), im: b.im.slice() };
}
