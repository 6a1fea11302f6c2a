/** Small models as plain problem data, and a slow, independent way to evaluate them. */

import { EigenvalueDecomposition, Matrix, inverse as realInverse } from "ml-matrix";
import type { Setting } from "../../src/margin/measure.js";
import { peakDefaults } from "../../src/margin/peaks.js";
import {
  buildModel,
  type ModelState,
  type ParametricModel,
  stateAt,
} from "../../src/model/parametric-model.js";
import type { DenseMatrix } from "../../src/numerics/dense/matrix.js";
import { createRandom, type Random } from "../../src/numerics/random.js";
import { parseFormula } from "../../src/problem/formula.js";
import type { Formula, Problem, TermGroup, Triplets } from "../../src/problem/problem.js";
import { type DensePencil, densePencil } from "../../src/reduction/reduced-model.js";

/** A matrix by rows. */
export type Rows = readonly (readonly number[])[];

export interface Case {
  readonly mass?: Rows;
  readonly damping?: Rows;
  readonly gyroscopic?: Rows;
  readonly stiffness?: Rows;
  readonly circulatory?: Rows;
  readonly frictional?: Rows;
  /** B as n×m; default: the identity. */
  readonly left?: Rows;
  /** C as p×n; default: the identity. */
  readonly right?: Rows;
  /** "none": no declared error at all. */
  readonly acts?: "stiffness" | "damping" | "none";
}

const groups: readonly TermGroup[] = [
  "mass",
  "damping",
  "gyroscopic",
  "stiffness",
  "circulatory",
  "frictional",
];

export function tripletsOf(rows: Rows, cols: number): Triplets {
  const entries = rows.flatMap((row, i) => row.map((value, j) => [i, j, value] as const));
  const filled = entries.filter(([, , value]) => value !== 0);
  return {
    rows: rows.length,
    cols,
    row: Int32Array.from(filled, ([i]) => i),
    col: Int32Array.from(filled, ([, j]) => j),
    value: Float64Array.from(filled, ([, , value]) => value),
  };
}

export function formula(source: string | number, names: readonly string[] = []): Formula {
  const { formula: found } = parseFormula(source, names);
  if (found === null) throw new Error(`not a formula: ${source}`);
  return found;
}

export function diagonal(values: readonly number[]): number[][] {
  return values.map((value, i) => values.map((_, j) => (i === j ? value : 0)));
}

export function constant(rows: number, cols: number, value: number): number[][] {
  return Array.from({ length: rows }, () => new Array<number>(cols).fill(value));
}

/** The problem of one case; `more` replaces any part of it. */
export function problemOf(given: Case, more: Partial<Problem> = {}): Problem {
  const present = groups.filter((group) => given[group] !== undefined);
  const first = given[present[0] ?? "mass"];
  if (first === undefined) throw new Error("a case needs a matrix");
  const dofs = first.length;
  const matrices = present.map(
    (name) => [name, { name, form: "entries" as const, triplets: tripletsOf(given[name]!, dofs) }] as const,
  );
  const { left, right, acts = "stiffness" } = given;
  return {
    title: "case",
    notes: null,
    path: "case.json",
    dofs,
    fixed: new Int32Array(0),
    matrices: new Map(matrices),
    terms: present.map((group) => ({
      group,
      matrix: group,
      name: group,
      factor: formula(1),
      validToHz: null,
      pointer: `/terms/${group}/0`,
    })),
    constants: new Map(),
    design: [],
    envelope: [],
    perturbations:
      acts === "none"
        ? []
        : [
            {
              name: "error",
              acts,
              kind: "complex",
              size: formula(1),
              left: left === undefined ? null : tripletsOf(left, left[0]?.length ?? 0),
              right: right === undefined ? null : tripletsOf(right, dofs),
            },
          ],
    margin: { measure: "radius", as: "rate", terms: null, bandHz: null, target: null },
    budget: [],
    tune: { seed: 1, tolerance: 1e-3 },
    inputs: [],
    ...more,
  };
}

export function modelOf(given: Case): { model: ParametricModel; state: ModelState } {
  const model = buildModel(problemOf(given));
  return { model, state: stateAt(model, new Map()) };
}

export function denseOf(rows: Rows, cols: number = rows[0]?.length ?? 0): DenseMatrix {
  const values = new Float64Array(rows.length * cols);
  rows.forEach((row, i) => {
    row.forEach((value, j) => {
      values[i + j * rows.length] = value;
    });
  });
  return { rows: rows.length, cols, values };
}

/** The case as a dense pencil, straight from its entries. */
export function pencilOf(given: Case): DensePencil {
  const n = (given.mass ?? given.damping ?? given.stiffness ?? []).length;
  const { left = diagonal(new Array(n).fill(1)), right = diagonal(new Array(n).fill(1)) } = given;
  const sum = (...names: TermGroup[]) => {
    const out = constant(n, n, 0);
    for (const name of names)
      given[name]?.forEach((row, i) => {
        row.forEach((value, j) => {
          out[i]![j]! += value;
        });
      });
    return denseOf(out, n);
  };
  const powers = new Uint8Array(left[0]?.length ?? 0).fill(given.acts === "damping" ? 1 : 0);
  const rightTransposed = Array.from({ length: n }, (_, i) => right.map((row) => row[i]!));
  return densePencil(
    sum("mass"),
    sum("damping", "gyroscopic", "frictional"),
    sum("stiffness", "circulatory"),
    sum("stiffness"),
    denseOf(left),
    powers,
    denseOf(rightTransposed, right.length),
  );
}

export function settingFor(low: number, high: number, shift: number): Setting {
  return {
    band: { low, high },
    shift,
    omegaRef: Number.isFinite(high) ? high : shift,
    unit: 1,
    peaks: peakDefaults,
  };
}

/** A stable random model: M, K, D positive definite, small gyroscopic and circulatory parts. */
export function randomCase(seed: number, n: number, inputs: number, outputs: number, feeding = 0.05): Case {
  const random = createRandom(seed);
  const skew = randomRows(random, n, n);
  return {
    mass: definite(random, n, 1),
    damping: definite(random, n, 0.04),
    gyroscopic: skew.map((row, i) => row.map((value, j) => 0.1 * (value - skew[j]![i]!))),
    stiffness: definite(random, n, 4),
    circulatory: randomRows(random, n, n).map((row) => row.map((value) => feeding * value)),
    left: randomRows(random, n, inputs),
    right: randomRows(random, outputs, n),
  };
}

export function randomRows(random: Random, rows: number, cols: number): number[][] {
  return Array.from({ length: rows }, () => Array.from({ length: cols }, () => random.normal()));
}

/** size · (I + XXᵀ/n). */
export function definite(random: Random, n: number, size: number): number[][] {
  const x = randomRows(random, n, n);
  return x.map((row, i) =>
    row.map((_, j) => {
      const dot = row.reduce((sum, value, k) => sum + value * x[j]![k]!, 0);
      return size * ((i === j ? 1 : 0) + dot / n);
    }),
  );
}

const asMatrix = (a: DenseMatrix) => {
  const out = new Matrix(a.rows, a.cols);
  for (let j = 0; j < a.cols; j++) for (let i = 0; i < a.rows; i++) out.set(i, j, a.values[i + j * a.rows]!);
  return out;
};

/** The matrix itself, once it is known to be finite: on NaN or overflow ml-matrix never returns. */
function finite(a: Matrix): Matrix {
  if (a.to1DArray().every(Number.isFinite)) return a;
  throw new Error("a matrix for ml-matrix holds entries that are not finite");
}

/** σ_max(H(iω)) by the real form of the complex system, with another library's matrices throughout. */
export function slowGain(pencil: DensePencil, omega: number): number {
  const [m, c, s, b, ct] = [
    pencil.massMatrix,
    pencil.velocityMatrix,
    pencil.displacementMatrix,
    pencil.inputMatrix,
    pencil.outputTransposedMatrix,
  ].map(asMatrix) as [Matrix, Matrix, Matrix, Matrix, Matrix];
  const n = pencil.order;
  const re = Matrix.sub(s, Matrix.mul(m, omega * omega));
  const im = Matrix.mul(c, omega);
  const real = Matrix.zeros(2 * n, 2 * n);
  real.setSubMatrix(re, 0, 0).setSubMatrix(Matrix.mul(im, -1), 0, n);
  real.setSubMatrix(im, n, 0).setSubMatrix(re, n, n);
  const bRe = b.clone();
  const bIm = Matrix.zeros(b.rows, b.columns);
  pencil.powers.forEach((power, k) => {
    if (power === 0) return;
    bIm.setColumn(
      k,
      b.getColumn(k).map((value) => omega * value),
    );
    bRe.setColumn(k, new Array<number>(b.rows).fill(0));
  });
  const load = Matrix.zeros(2 * n, 2 * b.columns);
  load.setSubMatrix(bRe, 0, 0).setSubMatrix(Matrix.mul(bIm, -1), 0, b.columns);
  load.setSubMatrix(bIm, n, 0).setSubMatrix(bRe, n, b.columns);
  const out = Matrix.zeros(2 * ct.columns, 2 * n);
  out.setSubMatrix(ct.transpose(), 0, 0).setSubMatrix(ct.transpose(), ct.columns, n);
  const h = out.mmul(realInverse(finite(real))).mmul(load);
  // The singular values of the real form are those of H, each twice.
  const gram = h.transpose().mmul(h);
  const values = new EigenvalueDecomposition(finite(gram), { assumeSymmetric: true }).realEigenvalues;
  return Math.sqrt(Math.max(0, ...values));
}

/** Largest value of a function on [low, high]: a dense scan, then ternary search round the best sample. */
export function slowMaximum(f: (x: number) => number, low: number, high: number, samples = 4000) {
  const step = (high - low) / samples;
  let best = low;
  let most = f(low);
  for (let k = 1; k <= samples; k++) {
    const value = f(low + k * step);
    if (value > most) [best, most] = [low + k * step, value];
  }
  let [a, b] = [Math.max(low, best - step), Math.min(high, best + step)];
  for (let k = 0; k < 100; k++) {
    const [x, y] = [a + (b - a) / 3, b - (b - a) / 3];
    if (f(x) < f(y)) a = x;
    else b = y;
  }
  const at = 0.5 * (a + b);
  return f(at) > most ? { at, value: f(at) } : { at: best, value: most };
}

/** Eigenvalues of P by another library, from the companion form [0 I; −M⁻¹S −M⁻¹C]; M regular. */
export function companionEigenvalues(pencil: DensePencil): { re: number; im: number }[] {
  const [m, c, s] = [pencil.massMatrix, pencil.velocityMatrix, pencil.displacementMatrix].map(asMatrix) as [
    Matrix,
    Matrix,
    Matrix,
  ];
  const n = pencil.order;
  const inverse = realInverse(finite(m));
  const a = Matrix.zeros(2 * n, 2 * n);
  a.setSubMatrix(Matrix.eye(n), 0, n);
  a.setSubMatrix(inverse.mmul(s).mul(-1), n, 0).setSubMatrix(inverse.mmul(c).mul(-1), n, n);
  const { realEigenvalues, imaginaryEigenvalues } = new EigenvalueDecomposition(finite(a));
  return realEigenvalues.map((re, k) => ({ re, im: imaginaryEigenvalues[k]! }));
}
