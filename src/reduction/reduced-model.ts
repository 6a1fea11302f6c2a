import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import type { Pencil, PencilFactor } from "../model/pencil.js";
import { factorDenseComplex } from "../numerics/dense/lu.js";
import type { DenseMatrix } from "../numerics/dense/matrix.js";
import { complexZeros, zeros } from "../numerics/dense/matrix.js";
import { denseOperator } from "../numerics/real-operator.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { TermGroup } from "../problem/problem.js";
import { projectChannel, projectSquare } from "./projection.js";

/** A pencil whose matrices are at hand, small enough for dense eigenvalues. */
export interface DensePencil extends Pencil {
  readonly massMatrix: DenseMatrix;
  readonly velocityMatrix: DenseMatrix;
  readonly displacementMatrix: DenseMatrix;
  /** K without the circulatory part. */
  readonly stiffnessMatrix: DenseMatrix;
  readonly inputMatrix: DenseMatrix;
  readonly outputTransposedMatrix: DenseMatrix;
}

/** A reduced model as plain data, for other threads. */
export interface ReducedSnapshot {
  readonly order: number;
  /** VᵀA_kV, one per term of the model. */
  readonly terms: readonly DenseMatrix[];
  /** VᵀB and VᵀCᵀ, one per perturbation block. */
  readonly left: readonly DenseMatrix[];
  readonly right: readonly DenseMatrix[];
}

/**
 * The parametric model projected once, VᵀA_kV for every constant matrix, and assembled for
 * a new design and operating point in O(terms · r²). One-sided projection keeps every
 * symmetry and sign.
 *
 * Source: Beattie & Gugercin, IEEE CDC 2009, structure-preserving projection.
 */
export class ReducedModel {
  readonly #model: ParametricModel;
  readonly #projected = new Map<SparseMatrix, DenseMatrix>();
  #left: readonly DenseMatrix[] = [];
  #right: readonly DenseMatrix[] = [];
  #order = 0;

  constructor(model: ParametricModel) {
    this.#model = model;
  }

  get order(): number {
    return this.#order;
  }

  /** Takes in the basis V, whose first columns must be those of the last call. */
  project(v: DenseMatrix): void {
    const known = this.#order;
    for (const { matrix, group } of this.#model.terms) {
      const before = this.#projected.get(matrix);
      if (before?.rows === v.cols) continue;
      this.#projected.set(matrix, projectSquare(matrix, symmetryOf(group), v, before ?? zeros(0, 0), known));
    }
    this.#left = this.#model.blocks.map((block) => projectChannel(block.left, v));
    this.#right = this.#model.blocks.map((block) => projectChannel(block.rightTransposed, v));
    this.#order = v.cols;
  }

  snapshot(): ReducedSnapshot {
    const terms = this.#model.terms.map(({ matrix }) => this.#projected.get(matrix)!);
    return { order: this.#order, terms, left: this.#left, right: this.#right };
  }

  /** The reduced model that a snapshot was taken of, as far as pencils are concerned. */
  static from(model: ParametricModel, { order, terms, left, right }: ReducedSnapshot): ReducedModel {
    const reduced = new ReducedModel(model);
    model.terms.forEach(({ matrix }, k) => {
      reduced.#projected.set(matrix, terms[k]);
    });
    reduced.#left = left;
    reduced.#right = right;
    reduced.#order = order;
    return reduced;
  }

  pencilAt(state: ModelState): DensePencil {
    const r = this.#order;
    const mass = zeros(r, r);
    const velocity = zeros(r, r);
    const stiffness = zeros(r, r);
    const circulatory = zeros(r, r);
    const targets = {
      mass,
      stiffness,
      circulatory,
      damping: velocity,
      gyroscopic: velocity,
      frictional: velocity,
    };
    this.#model.terms.forEach((term, k) => {
      addScaled(targets[term.group].values, state.coefficients[k], this.#projected.get(term.matrix)!.values);
    });
    addScaled(circulatory.values, 1, stiffness.values);
    const sizes = state.sizes;
    const powers = this.#model.blocks.flatMap((b) => new Array<number>(b.left.cols).fill(b.power));
    return densePencil(
      mass,
      velocity,
      circulatory,
      stiffness,
      sideBySide(r, this.#left, sizes),
      Uint8Array.from(powers),
      sideBySide(r, this.#right, new Float64Array(sizes.length).fill(1)),
    );
  }
}

/** A pencil from dense matrices; nothing is copied. */
export function densePencil(
  massMatrix: DenseMatrix,
  velocityMatrix: DenseMatrix,
  displacementMatrix: DenseMatrix,
  stiffnessMatrix: DenseMatrix,
  inputMatrix: DenseMatrix,
  powers: Uint8Array,
  outputTransposedMatrix: DenseMatrix,
): DensePencil {
  const order = massMatrix.rows;
  return {
    order,
    massMatrix,
    velocityMatrix,
    displacementMatrix,
    stiffnessMatrix,
    inputMatrix,
    outputTransposedMatrix,
    mass: denseOperator(massMatrix),
    velocity: denseOperator(velocityMatrix),
    displacement: denseOperator(displacementMatrix),
    input: denseOperator(inputMatrix),
    powers,
    outputTransposed: denseOperator(outputTransposedMatrix),
    factor: (sRe, sIm) => factorDensePencil(massMatrix, velocityMatrix, displacementMatrix, sRe, sIm),
  };
}

function factorDensePencil(
  m: DenseMatrix,
  c: DenseMatrix,
  s: DenseMatrix,
  sRe: number,
  sIm: number,
): PencilFactor {
  const p = complexZeros(m.rows, m.cols);
  const squareRe = sRe * sRe - sIm * sIm;
  const squareIm = 2 * sRe * sIm;
  for (let q = 0; q < m.values.length; q++) {
    p.re[q] = squareRe * m.values[q] + sRe * c.values[q] + s.values[q];
    p.im[q] = squareIm * m.values[q] + sIm * c.values[q];
  }
  const lu = factorDenseComplex(p);
  const backwardError = Number.EPSILON;
  return {
    sRe,
    sIm,
    solveInPlace: (b) => {
      lu.solveInPlace(b);
      return backwardError;
    },
    solveAdjointInPlace: (b) => {
      lu.solveAdjointInPlace(b);
      return backwardError;
    },
    release: () => undefined,
  };
}

function symmetryOf(group: TermGroup): 1 | -1 | 0 {
  if (group === "gyroscopic") return -1;
  return group === "circulatory" || group === "frictional" ? 0 : 1;
}

function addScaled(y: Float64Array, alpha: number, x: Float64Array): void {
  if (alpha === 0) return;
  for (let q = 0; q < y.length; q++) y[q] += alpha * x[q];
}

function sideBySide(rows: number, parts: readonly DenseMatrix[], factors: Float64Array): DenseMatrix {
  const out = zeros(
    rows,
    parts.reduce((sum, a) => sum + a.cols, 0),
  );
  let from = 0;
  parts.forEach((a, k) => {
    for (let q = 0; q < a.values.length; q++) out.values[from + q] = factors[k] * a.values[q];
    from += a.values.length;
  });
  return out;
}
