/**
 * Matrices of some hundreds to a few thousand unknowns with awkward structure, for solves checked against SciPy.
 * Values come from +, −, ×, ÷ and powers of two of seeded numbers, so they are the same on every machine.
 */

import type { ComplexVector } from "../../src/numerics/dense/matrix.js";
import { createRandom, type Random } from "../../src/numerics/random.js";
import {
  type ComplexValues,
  fromTriplets,
  type SparseMatrix,
  type SparsePattern,
} from "../../src/numerics/sparse/sparse-matrix.js";
import { hexahedron, square } from "../benchmarks/elements.js";
import { type BenchmarkModel, type Element, type Grid, modelOn } from "../benchmarks/models.js";

/** Weights per case: each gives one number Σ wᵢ xᵢ to compare. */
export const WEIGHTS = 3;

export interface SolveCase {
  readonly name: string;
  readonly pattern: SparsePattern;
  readonly dynamic: ComplexValues;
  /** A real symmetric matrix on the same pattern. */
  readonly undamped: Float64Array;
  readonly right: ComplexVector;
  readonly weights: readonly ComplexVector[];
}

/** Coordinates with a complex and a real value. */
interface Entries {
  readonly row: number[];
  readonly col: number[];
  readonly re: number[];
  readonly im: number[];
  readonly undamped: number[];
}

export function solveCases(): SolveCase[] {
  return [
    finish("plate", entriesOf(plate([20, 20, 1], 1))),
    finish("slab", entriesOf(modelOn([10, 10, 5], hexahedron(), createRandom(2)))),
    finish("cube", entriesOf(modelOn([7, 7, 7], hexahedron(), createRandom(3)))),
    tiedPlate(),
    scaledSlab(),
    starContact(),
    looseParts(),
    firstOrder(),
    follower(),
    resonance(),
  ];
}

const plate = (grid: Grid, seed: number, change: Partial<Element> = {}): BenchmarkModel =>
  modelOn(grid, { ...square(), ...change }, createRandom(seed));

const symmetricUniform = (random: Random): number => 2 * random.uniform() - 1;

/** Slopes without mass, and Lagrange multipliers that tie the slopes of distant nodes: [P Cᵀ; C 0]. */
function tiedPlate(): SolveCase {
  const mass = square().mass.map((m, q) => (q % 3 === 0 && Math.floor(q / 12) % 3 === 0 ? m : 0));
  const model = plate([24, 20, 1], 4, { mass });
  const entries = entriesOf(model);
  const order = model.pattern.cols;
  for (let t = 0; t < 60; t++) {
    enter(entries, order + t, order + t, 0, 0, 0);
    for (const [dof, sign] of [
      [3 * t + 1, 1],
      [order - 1 - 6 * t, -1],
    ] as const) {
      enter(entries, order + t, dof, sign, 0, sign);
      enter(entries, dof, order + t, sign, 0, sign);
    }
  }
  return finish("tied plate with massless slopes", entries);
}

/** S A S with S from 2⁻²⁰ to 2²⁰: entries spread over 10^±12. */
function scaledSlab(): SolveCase {
  const model = modelOn([9, 9, 5], hexahedron(), createRandom(5));
  const random = createRandom(55);
  const scale = Float64Array.from(
    { length: model.pattern.cols },
    () => 2 ** Math.round(20 * symmetricUniform(random)),
  );
  return finish("slab with scales 1e-12 to 1e12", entriesOf(model), scale);
}

/** One contact dof without stiffness of its own that touches every dof of a plate, pushing otherwise than pushed. */
function starContact(): SolveCase {
  const model = plate([18, 18, 1], 6);
  const entries = entriesOf(model);
  const random = createRandom(66);
  const contact = model.pattern.cols;
  enter(entries, contact, contact, 0, 0, 0);
  for (let dof = 0; dof < contact; dof++) {
    const force = symmetricUniform(random);
    enter(entries, dof, contact, force, 0, force);
    enter(entries, contact, dof, symmetricUniform(random), 0.1 * symmetricUniform(random), force);
  }
  return finish("star-shaped contact", entries);
}

/** Three plates of very different stiffness that do not touch, and single dofs. */
function looseParts(): SolveCase {
  const parts = [
    { model: plate([10, 9, 1], 7), scale: 2 ** 20 },
    { model: plate([12, 11, 1], 8), scale: 1 },
    { model: plate([8, 14, 1], 9), scale: 2 ** -20 },
  ];
  const entries: Entries = { row: [], col: [], re: [], im: [], undamped: [] };
  const scale: number[] = [];
  for (const part of parts) {
    const start = scale.length;
    const own = entriesOf(part.model);
    own.row.forEach((i, t) => {
      enter(entries, start + i, start + own.col[t]!, own.re[t]!, own.im[t]!, own.undamped[t]!);
    });
    for (let i = 0; i < part.model.pattern.cols; i++) scale.push(part.scale);
  }
  for (let t = 0; t < 7; t++) {
    enter(entries, scale.length, scale.length, t - 3.5, 0.25, t - 3.5);
    scale.push(2 ** (6 * t - 18));
  }
  return finish("loose parts", entries, Float64Array.from(scale));
}

/** iω I − A of a random network whose couplings run one way only; M = 0, D = I, N = −A. */
function firstOrder(): SolveCase {
  const order = 1500;
  const random = createRandom(10);
  const entries: Entries = { row: [], col: [], re: [], im: [], undamped: [] };
  for (let i = 0; i < order; i++) {
    enter(entries, i, i, 0.3 * random.uniform(), 1, symmetricUniform(random));
    for (let k = 0; k < 2; k++) {
      const j = Math.floor(random.uniform() * order);
      if (j === i) continue;
      const both = symmetricUniform(random);
      enter(entries, i, j, symmetricUniform(random), 0, both);
      enter(entries, j, i, 0, 0, both);
    }
  }
  return finish("first order", entries);
}

/** Circulatory terms as large as the stiffness, and every third diagonal zero. */
function follower(): SolveCase {
  const model = modelOn([8, 8, 4], hexahedron(), createRandom(11));
  const random = createRandom(111);
  const entries = entriesOf(model);
  entries.row.forEach((i, t) => {
    const onDiagonal = i === entries.col[t];
    const kept = onDiagonal && i % 3 === 0 ? 0 : 1;
    entries.re[t] = kept * (entries.re[t]! + (onDiagonal ? 0 : 0.5 * symmetricUniform(random)));
    entries.im[t] = kept * entries.im[t]!;
    entries.undamped[t] = kept * entries.undamped[t]!;
  });
  return finish("follower forces and zero diagonals", entries);
}

/** K − ω²M without any damping, ω within 1e-8 of a natural frequency (found with SciPy). */
function resonance(): SolveCase {
  const entries = entriesOf(plate([10, 10, 1], 12, { omega: RESONANT_OMEGA }));
  return finish("resonance without damping", {
    ...entries,
    re: entries.undamped,
    im: entries.re.map(() => 0),
  });
}
const RESONANT_OMEGA = 0.08798978792282262;

function entriesOf({ pattern, dynamic, undamped }: BenchmarkModel): Entries {
  const col: number[] = [];
  for (let j = 0; j < pattern.cols; j++) {
    for (let p = pattern.colStart[j]!; p < pattern.colStart[j + 1]!; p++) col.push(j);
  }
  return {
    row: Array.from(pattern.rowIndex),
    col,
    re: Array.from(dynamic.re),
    im: Array.from(dynamic.im),
    undamped: Array.from(undamped.values),
  };
}

function enter(entries: Entries, i: number, j: number, re: number, im: number, undamped: number): void {
  entries.row.push(i);
  entries.col.push(j);
  entries.re.push(re);
  entries.im.push(im);
  entries.undamped.push(undamped);
}

/** S A S, with a right-hand side and weights of the size that S gives forces and inverse displacements. */
function finish(name: string, entries: Entries, scale?: Float64Array): SolveCase {
  const { row, col } = entries;
  const order = 1 + row.reduce((most, i) => Math.max(most, i), 0);
  const of = (i: number): number => scale?.[i] ?? 1;
  const assembled = (values: readonly number[]): SparseMatrix =>
    fromTriplets(
      order,
      order,
      row,
      col,
      values.map((v, t) => v * of(row[t]!) * of(col[t]!)),
    );
  const re = assembled(entries.re);
  const random = createRandom(order);
  const vector = (): ComplexVector => ({
    re: Float64Array.from({ length: order }, (_, i) => of(i) * symmetricUniform(random)),
    im: Float64Array.from({ length: order }, (_, i) => of(i) * symmetricUniform(random)),
  });
  return {
    name,
    pattern: re,
    dynamic: { re: re.values, im: assembled(entries.im).values },
    undamped: assembled(entries.undamped).values,
    right: vector(),
    weights: Array.from({ length: WEIGHTS }, vector),
  };
}
