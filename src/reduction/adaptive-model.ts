import { type EnergyForm, energyForm } from "../fullorder/energy-form.js";
import type { FullModel, FullPencil } from "../fullorder/full-model.js";
import { countModesBelow, naturalModes } from "../fullorder/natural-modes.js";
import type { ModelState } from "../model/parametric-model.js";
import { column, type DenseMatrix, zeros } from "../numerics/dense/matrix.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { Basis } from "./basis.js";
import { type DensePencil, ReducedModel, type ReducedSnapshot } from "./reduced-model.js";

/** Models up to this order are their own reduced model: the basis spans everything. */
const carriedWhole = 60;
/** The same for models judged without a band. */
const carriedWholeWithoutBand = 200;
/** Larger ones without a band are judged up to about this many modes, and the result says how far that was. */
const modesWithoutBand = 160;
/** More modes than this no reduced model here carries. */
export const mostModes = 500;

/** Highest mode taken at the first sample and at further ones, over the band's upper end. */
const firstReach = 1.3;
const laterReach = 1.1;

/** What is known about the start basis. */
export interface ModeCount {
  readonly upToOmega: number;
  readonly count: number;
  readonly complete: boolean;
}

/**
 * A full model beside the reduced model that learns from it: one basis for all designs, operating
 * points and multipliers, started from complete real modes and enriched by every full solve.
 */
export class AdaptiveModel {
  readonly full: FullModel;
  readonly #basis: Basis;
  readonly #reduced: ReducedModel;
  readonly #energy: EnergyForm;
  readonly #modeCounts: ModeCount[] = [];
  /** s₀ [rad/s], the size of the eigenvalues that matter. */
  readonly shift: number;
  /** The basis spans the whole space, so the reduced model is the full one. */
  readonly exact: boolean;
  /** Upper end of the searched frequencies [rad/s]; Infinity when all are. */
  readonly searchedTo: number;

  /** @param upperOmega - upper end of the band [rad/s], null when all frequencies are judged. */
  constructor(full: FullModel, start: ModelState, upperOmega: number | null) {
    this.full = full;
    const pencil = full.pencilAt(start);
    this.exact = full.order <= (upperOmega === null ? carriedWholeWithoutBand : carriedWhole);
    const typical = typicalFrequency(pencil);
    this.shift = upperOmega ?? (this.exact ? typical : frequencyOfMode(pencil, modesWithoutBand, typical));
    this.#energy = energyForm(pencil, 0.3 * this.shift);
    this.#basis = new Basis(this.#energy.matrix);
    this.#reduced = new ReducedModel(full.model);
    this.searchedTo =
      upperOmega === null ? (this.exact ? Number.POSITIVE_INFINITY : this.shift) : firstReach * upperOmega;
    if (this.exact) {
      this.#basis.append(unitVectors(full.order), 1e-14);
    } else {
      this.#appendModes(pencil, this.#energy, this.searchedTo, 1e-8);
      this.#appendStaticResponses();
    }
    this.#reduced.project(this.#basis.matrix);
  }

  get order(): number {
    return this.#basis.cols;
  }

  get modeCounts(): readonly ModeCount[] {
    return this.#modeCounts;
  }

  /** V, n×r; a view that stays valid until the basis grows. */
  get basis(): DenseMatrix {
    return this.#basis.matrix;
  }

  reducedAt(state: ModelState): DensePencil {
    return this.#reduced.pencilAt(state);
  }

  /** The reduced model as it stands, for other threads. */
  snapshot(): ReducedSnapshot {
    return this.#reduced.snapshot();
  }

  /** Real modes of a further sample, truncated in the energy norm: what it adds beyond 1 % is kept. */
  addSample(state: ModelState): void {
    if (this.exact) return;
    const pencil = this.full.pencilAt(state);
    const energy = energyForm(pencil, Math.sqrt(this.#energy.sigma));
    this.#appendModes(pencil, energy, (laterReach / firstReach) * this.searchedTo, 1e-2);
    this.#reduced.project(this.#basis.matrix);
  }

  /** Appends directions found by full solves, untruncated but for rounding. */
  enrich(vectors: Iterable<Float64Array>): void {
    if (this.#basis.append(vectors, 1e-10) > 0) this.#reduced.project(this.#basis.matrix);
  }

  #appendModes(pencil: FullPencil, energy: EnergyForm, upperOmega: number, dropBelow: number): void {
    const { count, reliable } = countModesBelow(pencil, upperOmega);
    const wanted = Math.min(count, mostModes);
    const modes = naturalModes(pencil, upperOmega, energy, wanted);
    this.#basis.append(columns(modes.vectors), dropBelow);
    this.#modeCounts.push({
      upToOmega: upperOmega,
      count,
      complete: modes.complete && reliable && wanted === count,
    });
  }

  /** (K + σM)⁻¹ applied to B, to Cᵀ and to the range of low-rank damping: wide ones are left to the greedy loop. */
  #appendStaticResponses(): void {
    const { blocks, terms } = this.full.model;
    const loads = [
      ...blocks.flatMap((block) => [block.left, block.rightTransposed]),
      ...terms.filter((term) => term.group === "damping").map((term) => term.matrix),
    ];
    for (const load of loads) {
      const dense = nonzeroColumns(load);
      if (dense.cols > 24) continue;
      this.#energy.factorisation.solveInPlace(dense);
      this.#basis.append(columns(dense), 1e-2);
    }
  }
}

/** s > 0 at which inertia, damping and stiffness together balance: ‖M‖s² + ‖C‖s = ‖S‖. */
function typicalFrequency(pencil: FullPencil): number {
  const m = pencil.mass.normBound;
  const c = pencil.velocity.normBound;
  const k = pencil.displacement.normBound;
  const denominator = c + Math.sqrt(c * c + 4 * m * k);
  return denominator > 0 && k > 0 ? (2 * k) / denominator : 1;
}

/** A frequency below which there are between half of `most` and `most` modes, by bisection on the inertia. */
function frequencyOfMode(pencil: FullPencil, most: number, highest: number): number {
  let [low, high] = [0, highest];
  for (let bisection = 0; bisection < 60; bisection++) {
    const middle = 0.5 * (low + high);
    const { count } = countModesBelow(pencil, middle);
    if (count > most) high = middle;
    else if (count < most / 2) low = middle;
    else return middle;
  }
  return high;
}

function* columns(a: DenseMatrix): Iterable<Float64Array> {
  for (let j = 0; j < a.cols; j++) yield column(a, j);
}

function* unitVectors(order: number): Iterable<Float64Array> {
  for (let i = 0; i < order; i++) {
    const unit = new Float64Array(order);
    unit[i] = 1;
    yield unit;
  }
}

/** The non-empty columns of a sparse matrix as dense ones. */
function nonzeroColumns(a: SparseMatrix): DenseMatrix {
  const filled = Array.from({ length: a.cols }, (_, j) => j).filter((j) => a.colStart[j + 1] > a.colStart[j]);
  const out = zeros(a.rows, filled.length);
  filled.forEach((j, k) => {
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++)
      out.values[a.rowIndex[p] + k * a.rows] = a.values[p];
  });
  return out;
}
