import { InputError } from "../errors.js";
import type { SparseMatrix, SparsePattern } from "../numerics/sparse/sparse-matrix.js";
import { fromTriplets } from "../numerics/sparse/sparse-matrix.js";
import type { Formula, Perturbation, Problem, TermGroup, Triplets } from "../problem/problem.js";
import { entrySlots, mergedPattern } from "./pattern.js";

/** One term φ(d, o) A of one of the six matrices, on the free dofs. */
export interface ModelTerm {
  readonly group: TermGroup;
  readonly name: string;
  readonly factor: Formula;
  readonly matrix: SparseMatrix;
  /** Where each entry of `matrix` stands in the model's pattern. */
  readonly slots: Int32Array;
  /** Whether the critical multiplier scales this term. */
  readonly multiplied: boolean;
}

/** One declared model error s^power · size · B Δ C. */
export interface PerturbationBlock {
  readonly name: string;
  readonly kind: Perturbation["kind"];
  readonly power: 0 | 1;
  readonly size: Formula;
  /** B, n×m. */
  readonly left: SparseMatrix;
  /** Cᵀ, n×p. */
  readonly rightTransposed: SparseMatrix;
}

/**
 * The affine parametric model: P(s) = s²M + s(D + G + F) + K + N, each matrix a sum Σ φ_k(d, o) A_k.
 * All A_k share one structurally symmetric pattern with full diagonal, so that one ordering
 * serves every frequency, design and operating point.
 */
export interface ParametricModel {
  /** Number of free dofs. */
  readonly order: number;
  /** 0-based dof of the problem file behind each free dof. */
  readonly freeDofs: Int32Array;
  readonly pattern: SparsePattern;
  readonly terms: readonly ModelTerm[];
  readonly blocks: readonly PerturbationBlock[];
}

/** Every name a formula may use: constants, design variables and operating parameters. */
export type Values = ReadonlyMap<string, number>;

/** The model frozen at one design, one operating point and one multiplier of the feeding terms. */
export interface ModelState {
  readonly values: Values;
  readonly multiplier: number;
  /** φ_k, with the multiplier in, one per term. */
  readonly coefficients: Float64Array;
  /** One per perturbation block. */
  readonly sizes: Float64Array;
}

const feeding: ReadonlySet<TermGroup> = new Set(["circulatory", "frictional"]);

/** Builds the model of a problem. Throws `InputError` when no dof is left free. */
export function buildModel(problem: Problem): ParametricModel {
  const { freeDofs, freeIndex } = freeNumbering(problem.dofs, problem.fixed);
  const order = freeDofs.length;
  if (order === 0) {
    throw InputError.of(
      "input.no-free-dofs",
      `${problem.path} /fixed`,
      "every dof is fixed",
      "Leave at least one dof free.",
    );
  }
  const used = new Map<string, SparseMatrix>();
  for (const term of problem.terms) {
    if (!used.has(term.matrix)) {
      used.set(term.matrix, restrict(problem.matrices.get(term.matrix)!.triplets, freeIndex, order, true));
    }
  }
  const pattern = mergedPattern(order, [...used.values()]);
  const slotsOf = new Map([...used].map(([name, matrix]) => [name, entrySlots(pattern, matrix)]));
  const named = problem.margin.terms;
  const terms = problem.terms.map((term) => ({
    group: term.group,
    name: term.name,
    factor: term.factor,
    matrix: used.get(term.matrix)!,
    slots: slotsOf.get(term.matrix)!,
    multiplied: named === null ? feeding.has(term.group) : named.includes(term.name),
  }));
  const blocks = problem.perturbations.map((block) => buildBlock(block, freeIndex, order));
  return { order, freeDofs, pattern, terms, blocks };
}

/** Coefficients and sizes at the given values; the multiplier scales the terms marked `multiplied`. */
export function stateAt(model: ParametricModel, values: Values, multiplier = 1): ModelState {
  const coefficients = Float64Array.from(
    model.terms,
    (term) => term.factor.evaluate(values) * (term.multiplied ? multiplier : 1),
  );
  const sizes = Float64Array.from(model.blocks, (block) => block.size.evaluate(values));
  return { values, multiplier, coefficients, sizes };
}

function freeNumbering(dofs: number, fixed: Int32Array): { freeDofs: Int32Array; freeIndex: Int32Array } {
  const freeIndex = new Int32Array(dofs);
  for (const dof of fixed) freeIndex[dof] = -1;
  const freeDofs = new Int32Array(dofs);
  let free = 0;
  for (let dof = 0; dof < dofs; dof++) {
    if (freeIndex[dof] < 0) continue;
    freeDofs[free] = dof;
    freeIndex[dof] = free++;
  }
  return { freeDofs: freeDofs.slice(0, free), freeIndex };
}

/** Rows (and, for square matrices, columns) of fixed dofs drop out. */
function restrict(t: Triplets, freeIndex: Int32Array, order: number, square: boolean): SparseMatrix {
  const row: number[] = [];
  const col: number[] = [];
  const value: number[] = [];
  for (let e = 0; e < t.value.length; e++) {
    const i = freeIndex[t.row[e]];
    const j = square ? freeIndex[t.col[e]] : t.col[e];
    if (i < 0 || j < 0) continue;
    row.push(i);
    col.push(j);
    value.push(t.value[e]);
  }
  return fromTriplets(order, square ? order : t.cols, row, col, value);
}

function buildBlock(block: Perturbation, freeIndex: Int32Array, order: number): PerturbationBlock {
  const identity = () => {
    const diagonal = Int32Array.from({ length: order }, (_, i) => i);
    return fromTriplets(order, order, diagonal, diagonal, new Float64Array(order).fill(1));
  };
  const { left, right } = block;
  return {
    name: block.name,
    kind: block.kind,
    power: block.acts === "damping" ? 1 : 0,
    size: block.size,
    left: left === null ? identity() : restrict(left, freeIndex, order, false),
    rightTransposed: right === null ? identity() : restrict(flip(right), freeIndex, order, false),
  };
}

function flip(t: Triplets): Triplets {
  return { rows: t.cols, cols: t.rows, row: t.col, col: t.row, value: t.value };
}
