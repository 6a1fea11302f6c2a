import { equilibrationExponents } from "../numerics/sparse/equilibration.js";
import type { SparsePattern } from "../numerics/sparse/sparse-matrix.js";
import { emptyRows, type GroupSum, isRegularBlock, principalBlock } from "./structure-check.js";

export type PencilIndex = 0 | 1 | "higher" | "not determined";

/** Up to this order the index is found by dense elimination, whatever the kernel of M looks like. */
const densest = 400;
/** Pivots below this, relative to the largest entry of their matrix, count as zero. */
const rankTolerance = 1e-10;

/**
 * Index of s²M + sC + S as a differential-algebraic system, C = D + G + F, S = K + N: with M split into its
 * range (block M₁) and its kernel Z, written for the states (q₁, q₁', q_Z) without a velocity of q_Z,
 *
 *     0        when M is regular: every dof has inertia;
 *     1        when C_ZZ is regular (q_Z follows its own first-order equation), or when on the right and left
 *              kernels w, u of C_ZZ the block  uᵀ(S_ZZ − C_Z1 M₁⁻¹ C_1Z)w  is regular (q_Z is then a function
 *              of the other states);
 *     higher   otherwise: hidden constraints, such as Lagrange multipliers, or a singular pencil.
 *
 * Above 400 dofs Z must be spanned by massless dofs and C_ZZ be regular once those without any entry in C are set
 * apart; otherwise the answer is "not determined".
 *
 * @param deficiency - Number of zero eigenvalues of M.
 *
 * Source: Kunkel & Mehrmann, Differential-Algebraic Equations, EMS 2006, ch. 3 (the index by elimination).
 */
export function pencilIndex(
  pattern: SparsePattern,
  m: GroupSum,
  c: GroupSum,
  s: GroupSum,
  frequency: number,
  deficiency: number,
): PencilIndex {
  if (deficiency === 0) return 0;
  if (pattern.rows <= densest) return denseIndex(pattern, [m, c, s], frequency);
  const massless = emptyRows(pattern, m);
  const spanned = massless.reduce((sum, flag) => sum + flag, 0) === deficiency;
  if (!spanned) return "not determined";
  const undamped = emptyRows(pattern, columnsToo(pattern, c));
  const pick = (flag: number) =>
    Int32Array.from(massless.keys()).filter((i) => massless[i] === 1 && undamped[i] === flag);
  if (!isRegularBlock(principalBlock(pattern, c.values, pick(0)))) return "not determined";
  return isRegularBlock(principalBlock(pattern, s.values, pick(1))) ? 1 : "higher";
}

/** |C| + |C|ᵀ, whose empty rows are those of C with an empty column as well. */
function columnsToo(pattern: SparsePattern, c: GroupSum): GroupSum {
  const values = new Float64Array(c.values.length);
  const next = pattern.colStart.slice(0, pattern.cols);
  // The pattern is structurally symmetric, so walking it by columns meets the mirrored entries in order.
  for (let j = 0; j < pattern.cols; j++) {
    for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) {
      const q = next[pattern.rowIndex[p]]++;
      const noise = 16 * Number.EPSILON * Math.max(c.moduli[p], c.moduli[q]);
      const size = Math.max(Math.abs(c.values[p]), Math.abs(c.values[q]));
      values[p] = size > noise ? size : 0;
    }
  }
  return { values, moduli: values };
}

function denseIndex(pattern: SparsePattern, sums: readonly GroupSum[], frequency: number): PencilIndex {
  const n = pattern.rows;
  const weights = [frequency * frequency, frequency, 1];
  const total = sums[0].moduli.map((_, p) =>
    sums.reduce((sum, { moduli }, k) => sum + weights[k] * moduli[p], 0),
  );
  const exponents = equilibrationExponents(pattern, total);
  const [m, c, s] = sums.map(({ values }, k) => {
    const dense = new Float64Array(n * n);
    for (let j = 0; j < n; j++) {
      for (let p = pattern.colStart[j]; p < pattern.colStart[j + 1]; p++) {
        const i = pattern.rowIndex[p];
        dense[i + j * n] = weights[k] * values[p] * 2 ** (exponents[i] + exponents[j]);
      }
    }
    return dense;
  });
  const [cTolerance, sTolerance] = [c, s].map((a) => rankTolerance * largestOf(a));
  const massRank = diagonalise(n, 0, m, [c, s], rankTolerance * largestOf(m));
  if (massRank === n) return 0;
  condenseInertia(n, massRank, m, c, s);
  const dampingRank = diagonalise(n, massRank, c, [s], cTolerance);
  return diagonalise(n, dampingRank, s, [], sTolerance) === n ? 1 : "higher";
}

function largestOf(a: Float64Array): number {
  return a.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
}

/** S_ZZ ← S_ZZ − C_Z1 M₁⁻¹ C_1Z with M₁ diagonal, the first `rank` dofs. */
function condenseInertia(n: number, rank: number, m: Float64Array, c: Float64Array, s: Float64Array): void {
  for (let j = rank; j < n; j++) {
    for (let k = 0; k < rank; k++) {
      const factor = c[k + j * n] / m[k + k * n];
      if (factor === 0) continue;
      for (let i = rank; i < n; i++) s[i + j * n] -= c[i + k * n] * factor;
    }
  }
}

/**
 * Elimination of A[from…, from…] by rows and columns with full pivoting, in place; the companions (n×n) undergo
 * the same operations. Stops at the first pivot at or below `tolerance`. Returns the end of the pivots.
 */
function diagonalise(
  n: number,
  from: number,
  a: Float64Array,
  companions: readonly Float64Array[],
  tolerance: number,
): number {
  const all = [a, ...companions];
  for (let k = from; k < n; k++) {
    const { row, col, size } = largestEntry(n, k, a);
    if (!(size > tolerance)) return k;
    for (const matrix of all) {
      swapRows(n, matrix, k, row);
      swapColumns(n, matrix, k, col);
    }
    const pivot = a[k + k * n];
    const down = a.slice(k * n, (k + 1) * n).map((value) => value / pivot);
    const across = Float64Array.from({ length: n }, (_, j) => a[k + j * n] / pivot);
    for (const matrix of all) eliminateInto(n, k, matrix, down, across);
  }
  return n;
}

function largestEntry(n: number, from: number, a: Float64Array): { row: number; col: number; size: number } {
  let [row, col, size] = [from, from, 0];
  for (let j = from; j < n; j++) {
    for (let i = from; i < n; i++) {
      const modulus = Math.abs(a[i + j * n]);
      if (modulus > size) [row, col, size] = [i, j, modulus];
    }
  }
  return { row, col, size };
}

/** Rows i > k lose down_i times row k, then columns j > k lose across_j times column k. */
function eliminateInto(
  n: number,
  k: number,
  a: Float64Array,
  down: Float64Array,
  across: Float64Array,
): void {
  for (let j = 0; j < n; j++) {
    const top = a[k + j * n];
    if (top === 0) continue;
    for (let i = k + 1; i < n; i++) a[i + j * n] -= down[i] * top;
  }
  for (let j = k + 1; j < n; j++) {
    const factor = across[j];
    if (factor === 0) continue;
    for (let i = 0; i < n; i++) a[i + j * n] -= factor * a[i + k * n];
  }
}

function swapRows(n: number, a: Float64Array, i: number, j: number): void {
  if (i === j) return;
  for (let k = 0; k < n; k++) [a[i + k * n], a[j + k * n]] = [a[j + k * n], a[i + k * n]];
}

function swapColumns(n: number, a: Float64Array, i: number, j: number): void {
  if (i === j) return;
  const kept = a.slice(i * n, (i + 1) * n);
  a.copyWithin(i * n, j * n, (j + 1) * n);
  a.set(kept, j * n);
}
