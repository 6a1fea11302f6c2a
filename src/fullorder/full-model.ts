import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import type { Pencil, PencilFactor } from "../model/pencil.js";
import type { RealOperator } from "../numerics/real-operator.js";
import { sparseOperator } from "../numerics/real-operator.js";
import type { SymbolicAnalysis } from "../numerics/sparse/analysis.js";
import { analyse } from "../numerics/sparse/analysis.js";
import { factorComplex } from "../numerics/sparse/complex-lu.js";
import { concatenateScaled, type SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { SymmetricFactorisation } from "../numerics/sparse/symmetric-ldl.js";
import { factorSymmetric } from "../numerics/sparse/symmetric-ldl.js";
import type { TermGroup } from "../problem/problem.js";

/** How often the full model was factored: the currency in which this program counts cost. */
export interface FactorisationCounts {
  complex: number;
  real: number;
}

/** The full model as a pencil, with the matrices that only it needs by themselves. */
export interface FullPencil extends Pencil {
  readonly state: ModelState;
  readonly massMatrix: SparseMatrix;
  /** K without the circulatory part. */
  readonly stiffnessMatrix: SparseMatrix;
  /** K − λM = LDLᵀ; K and M are symmetric, so its inertia counts the modes below λ. */
  factorUndamped(lambda: number): SymmetricFactorisation;
}

/** The full model: one ordering and one symbolic analysis for every frequency, design and operating point. */
export class FullModel {
  readonly model: ParametricModel;
  readonly counts: FactorisationCounts = { complex: 0, real: 0 };
  readonly analysis: SymbolicAnalysis;
  readonly #outputTransposed: RealOperator;
  #last: FullPencil | undefined;

  /** @param analysis - of the model's pattern, where another thread has made it already. */
  constructor(model: ParametricModel, analysis: SymbolicAnalysis = analyse(model.pattern)) {
    this.model = model;
    this.analysis = analysis;
    const ones = new Float64Array(model.blocks.length).fill(1);
    this.#outputTransposed = sparseOperator(
      concatenateScaled(
        model.order,
        model.blocks.map((block) => block.rightTransposed),
        ones,
      ),
    );
  }

  get order(): number {
    return this.model.order;
  }

  /** The pencil at one state; the last one is kept, since many questions in a row ask for the same. */
  pencilAt(state: ModelState): FullPencil {
    const last = this.#last;
    if (last !== undefined && sameModel(last.state, state)) return { ...last, state };
    this.#last = this.#makePencil(state);
    return this.#last;
  }

  #makePencil(state: ModelState): FullPencil {
    const { model, counts } = this;
    const { order, pattern, blocks } = model;
    const massMatrix = this.#assemble(state, ["mass"]);
    const stiffnessMatrix = this.#assemble(state, ["stiffness"]);
    const velocityMatrix = this.#assemble(state, ["damping", "gyroscopic", "frictional"]);
    const displacementMatrix = this.#assemble(state, ["stiffness", "circulatory"]);
    const input = concatenateScaled(
      order,
      blocks.map((block) => block.left),
      state.sizes,
    );

    const factor = (sRe: number, sIm: number): PencilFactor => {
      counts.complex++;
      const values = combineValues(massMatrix, velocityMatrix, displacementMatrix, sRe, sIm);
      const lu = factorComplex(this.analysis, pattern, values);
      return {
        sRe,
        sIm,
        solveInPlace: (b) => lu.solveInPlace(b).backwardError,
        solveAdjointInPlace: (b) => lu.solveAdjointInPlace(b).backwardError,
        release: () => lu.release(),
      };
    };
    const factorUndamped = (lambda: number): SymmetricFactorisation => {
      counts.real++;
      const m = massMatrix.values;
      return factorSymmetric(
        this.analysis,
        pattern,
        stiffnessMatrix.values.map((k, p) => k - lambda * m[p]),
      );
    };
    return {
      state,
      order,
      massMatrix,
      stiffnessMatrix,
      mass: sparseOperator(massMatrix),
      velocity: sparseOperator(velocityMatrix),
      displacement: sparseOperator(displacementMatrix),
      input: sparseOperator(input),
      powers: Uint8Array.from(
        blocks.flatMap((block) => new Array<number>(block.left.cols).fill(block.power)),
      ),
      outputTransposed: this.#outputTransposed,
      factor,
      factorUndamped,
    };
  }

  #assemble(state: ModelState, groups: readonly TermGroup[]): SparseMatrix {
    const { pattern, terms } = this.model;
    const values = new Float64Array(pattern.rowIndex.length);
    terms.forEach((term, k) => {
      const coefficient = state.coefficients[k];
      if (coefficient === 0 || !groups.includes(term.group)) return;
      const { slots } = term;
      const entries = term.matrix.values;
      for (let p = 0; p < slots.length; p++) values[slots[p]] += coefficient * entries[p];
    });
    return { ...pattern, values };
  }
}

/** The same matrices follow from the same coefficients. */
function sameModel(a: ModelState, b: ModelState): boolean {
  return (
    a.coefficients.every((value, k) => value === b.coefficients[k]) &&
    a.sizes.every((value, k) => value === b.sizes[k])
  );
}

/** s²M + sC + S on the common pattern. */
function combineValues(m: SparseMatrix, c: SparseMatrix, s: SparseMatrix, sRe: number, sIm: number) {
  const count = m.values.length;
  const re = new Float64Array(count);
  const im = new Float64Array(count);
  const squareRe = sRe * sRe - sIm * sIm;
  const squareIm = 2 * sRe * sIm;
  for (let p = 0; p < count; p++) {
    re[p] = squareRe * m.values[p] + sRe * c.values[p] + s.values[p];
    im[p] = squareIm * m.values[p] + sIm * c.values[p];
  }
  return { re, im };
}
