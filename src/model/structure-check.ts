import { complexZeros } from "../numerics/dense/matrix.js";
import { createRandom } from "../numerics/random.js";
import { analyse, type SymbolicAnalysis } from "../numerics/sparse/analysis.js";
import { factorComplex } from "../numerics/sparse/complex-lu.js";
import { equilibrationExponents } from "../numerics/sparse/equilibration.js";
import { type SparseMatrix, type SparsePattern, transpose } from "../numerics/sparse/sparse-matrix.js";
import { factorSymmetric } from "../numerics/sparse/symmetric-ldl.js";
import type { TermGroup } from "../problem/problem.js";
import type { ParametricModel } from "./parametric-model.js";

/** Σ φ_k A_k of some groups on the model's pattern, beside Σ |φ_k| |A_k|, against which rounding is measured. */
export interface GroupSum {
  readonly values: Float64Array;
  readonly moduli: Float64Array;
}

export function sumOfGroups(
  { pattern, terms }: ParametricModel,
  coefficients: Float64Array,
  groups: readonly TermGroup[],
): GroupSum {
  const values = new Float64Array(pattern.rowIndex.length);
  const moduli = new Float64Array(pattern.rowIndex.length);
  terms.forEach(({ group, slots, matrix }, k) => {
    if (!groups.includes(group)) return;
    const coefficient = coefficients[k];
    for (let p = 0; p < slots.length; p++) {
      values[slots[p]] += coefficient * matrix.values[p];
      moduli[slots[p]] += Math.abs(coefficient * matrix.values[p]);
    }
  });
  return { values, moduli };
}

/**
 * max |A − Aᵀ| / max |A|, or of A + Aᵀ where `sign` is −1; 0 for A = 0. A square. Cost O(nonzeros).
 */
export function measuredAsymmetry(a: SparseMatrix, sign: 1 | -1): number {
  const mirrored = transpose(a);
  const column = new Float64Array(a.rows);
  let departure = 0;
  let largest = 0;
  for (let j = 0; j < a.cols; j++) {
    const [from, to] = [mirrored.colStart[j], mirrored.colStart[j + 1]];
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) {
      column[a.rowIndex[p]] = a.values[p];
      largest = Math.max(largest, Math.abs(a.values[p]));
    }
    // An entry without a partner is met when the transpose's column is walked, here or there.
    for (let p = from; p < to; p++) {
      const difference = column[mirrored.rowIndex[p]] - sign * mirrored.values[p];
      departure = Math.max(departure, Math.abs(difference));
    }
    for (let p = a.colStart[j]; p < a.colStart[j + 1]; p++) column[a.rowIndex[p]] = 0;
  }
  return largest === 0 ? 0 : departure / largest;
}

export type Verdict = "zero" | "positive definite" | "positive semidefinite" | "indefinite";

/** What the inertia of a symmetric matrix says. */
export interface Definiteness {
  readonly verdict: Verdict;
  /** Eigenvalues that are negative beyond the tolerance. */
  readonly negative: number;
  /** Eigenvalues that are zero within the tolerance, empty rows included. */
  readonly deficiency: number;
  /** False when an eigenvalue lies so close to the tolerance itself that the count is no proof. */
  readonly proved: boolean;
  readonly factorisations: number;
}

/** Eigenvalues below this, relative to 1 in the equilibrated matrix, count as zero. */
export const definitenessTolerance = 1e-10;

/**
 * Definiteness of A by Sylvester's law: with the diagonal W that equilibrates |A|, the inertia of A − εW counts
 * the eigenvalues of W^-½ A W^-½ above ε = 1e-10, that of A + εW those below −ε. W rather than the
 * largest entry of a row makes the verdict the same in every system of units. One or two real factorisations.
 */
export function definitenessOf(
  analysis: SymbolicAnalysis,
  pattern: SparsePattern,
  { values, moduli }: GroupSum,
): Definiteness {
  const { order } = analysis;
  if (values.every((value) => value === 0)) {
    return { verdict: "zero", negative: 0, deficiency: order, proved: true, factorisations: 0 };
  }
  const weight = equilibrationExponents(pattern, moduli).map((e) => -2 * e);
  const empty = emptyRows(pattern, { values, moduli });
  const diagonal = diagonalSlots(pattern);
  const inertiaAt = (shift: number) => {
    const shifted = values.slice();
    // An empty row gets 1 in both, so that it counts as positive and cannot disturb.
    for (let i = 0; i < order; i++) shifted[diagonal[i]] += empty[i] === 1 ? 1 : shift * 2 ** weight[i];
    return factorSymmetric(analysis, pattern, shifted);
  };
  const emptyCount = empty.reduce((sum, flag) => sum + flag, 0);
  const above = inertiaAt(-definitenessTolerance);
  const positive = above.inertia.positive - emptyCount;
  if (positive === order && above.inertiaReliable) {
    return { verdict: "positive definite", negative: 0, deficiency: 0, proved: true, factorisations: 1 };
  }
  const below = inertiaAt(definitenessTolerance);
  const negative = below.inertia.negative;
  return {
    verdict: negative > 0 ? "indefinite" : "positive semidefinite",
    negative,
    deficiency: order - positive - negative,
    proved: above.inertiaReliable && below.inertiaReliable,
    factorisations: 2,
  };
}

/** 1 for each row whose entries are all zero, or nothing but what cancellation left. */
export function emptyRows(pattern: SparsePattern, { values, moduli }: GroupSum): Uint8Array {
  const empty = new Uint8Array(pattern.rows).fill(1);
  for (let p = 0; p < values.length; p++) {
    if (Math.abs(values[p]) > 16 * Number.EPSILON * moduli[p]) empty[pattern.rowIndex[p]] = 0;
  }
  return empty;
}

function diagonalSlots({ cols, colStart, rowIndex }: SparsePattern): Int32Array {
  const slots = new Int32Array(cols);
  for (let j = 0; j < cols; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) if (rowIndex[p] === j) slots[j] = p;
  }
  return slots;
}

/**
 * s > 0 [rad/s] at which inertia and the rest balance on the typical dof: the median over rows of
 * (‖S‖/‖M‖)^½, or of ‖S‖/‖C‖ where no row has both M and S, row norms being largest moduli; 1 where neither exists.
 */
export function ownFrequency(pattern: SparsePattern, m: GroupSum, c: GroupSum, s: GroupSum): number {
  const [inertia, velocity, stiffness] = [m, c, s].map(({ moduli }) => largestInRows(pattern, moduli));
  const vibrating: number[] = [];
  const creeping: number[] = [];
  for (let i = 0; i < pattern.rows; i++) {
    if (stiffness[i] === 0) continue;
    if (inertia[i] > 0) vibrating.push(Math.sqrt(stiffness[i] / inertia[i]));
    else if (velocity[i] > 0) creeping.push(stiffness[i] / velocity[i]);
  }
  const list = (vibrating.length > 0 ? vibrating : creeping).sort((a, b) => a - b);
  return list[list.length >> 1] ?? 1;
}

function largestInRows(pattern: SparsePattern, moduli: Float64Array): Float64Array {
  const largest = new Float64Array(pattern.rows);
  for (let p = 0; p < moduli.length; p++) {
    const i = pattern.rowIndex[p];
    if (moduli[p] > largest[i]) largest[i] = moduli[p];
  }
  return largest;
}

/** s²M + sC + S for real s. */
export function pencilValues(s: number, m: GroupSum, c: GroupSum, k: GroupSum): Float64Array {
  return k.values.map((value, p) => value + s * (c.values[p] + s * m.values[p]));
}

/** Growth of a solution, in the equilibrated matrix, from which on it is singular to working precision. */
const singularGrowth = 1e13;

/**
 * Whether a real matrix is singular to working precision: a pivot was replaced, or a random right-hand side comes
 * back with a useless backward error or grown by 1e13 in the equilibrated matrix. One complex factorisation.
 *
 * @param values - In the order of the pattern.
 * @returns null for a regular matrix, otherwise the rows (at most five) that move most in its null vector.
 */
export function singularMotion(
  analysis: SymbolicAnalysis,
  pattern: SparsePattern,
  values: Float64Array,
): Int32Array | null {
  const { rows } = pattern;
  const exponents = equilibrationExponents(pattern, values.map(Math.abs));
  const scaled = new Float64Array(values.length);
  for (let j = 0; j < rows; j++) {
    for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) {
      scaled[p] = values[p] * 2 ** (exponents[pattern.rowIndex[p]] + exponents[j]);
    }
  }
  const factor = factorComplex(analysis, pattern, { re: scaled, im: new Float64Array(values.length) });
  const random = createRandom(11);
  const x = complexZeros(rows, 1);
  for (let i = 0; i < rows; i++) x.re[i] = 2 * random.uniform() - 1;
  const { backwardError } = factor.solveInPlace(x);
  const largest = x.re.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
  if (factor.negligiblePivots === 0 && backwardError < 1e-8 && largest < singularGrowth) return null;
  return Int32Array.from(x.re.keys())
    .filter((i) => Math.abs(x.re[i]) >= 0.3 * largest)
    .sort((i, j) => Math.abs(x.re[j]) - Math.abs(x.re[i]))
    .slice(0, 5);
}

/** The rows and columns `kept` (ascending) of a matrix with structurally symmetric pattern and full diagonal. */
export function principalBlock(pattern: SparsePattern, values: Float64Array, kept: Int32Array): SparseMatrix {
  const place = new Int32Array(pattern.rows).fill(-1);
  kept.forEach((row, at) => {
    place[row] = at;
  });
  const colStart = new Int32Array(kept.length + 1);
  const rowIndex: number[] = [];
  const out: number[] = [];
  kept.forEach((j, at) => {
    for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) {
      if (place[pattern.rowIndex[p]] < 0) continue;
      rowIndex.push(place[pattern.rowIndex[p]]);
      out.push(values[p]);
    }
    colStart[at + 1] = out.length;
  });
  const size = kept.length;
  return {
    rows: size,
    cols: size,
    colStart,
    rowIndex: Int32Array.from(rowIndex),
    values: Float64Array.from(out),
  };
}

/** Whether a block is regular to working precision; an empty one is. */
export function isRegularBlock(a: SparseMatrix): boolean {
  return a.rows === 0 || singularMotion(analyse(a), a, a.values) === null;
}
