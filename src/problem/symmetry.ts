import type { Triplets } from "./problem.js";
import { add, transposed } from "./triplets.js";

/** The pair of entries that departs most from symmetry, 0-based. */
export interface Asymmetry {
  readonly row: number;
  readonly col: number;
  /** Entry (row, col) and entry (col, row). */
  readonly value: number;
  readonly mirrored: number;
}

/** Departure from symmetry that is taken for rounding, relative to the largest entry. */
const rounding = 1e-10;

/**
 * Whether A = sign·Aᵀ (1: symmetric, −1: skew-symmetric) to 1e-10 of the largest entry.
 * Cost O(entries + n).
 *
 * @returns null if so, otherwise the worst pair.
 */
export function asymmetry(a: Triplets, sign: 1 | -1): Asymmetry | null {
  const difference = add(a, transposed(a, -sign));
  let worst = -1;
  let most = rounding * largest(a.value);
  for (let t = 0; t < difference.value.length; t++) {
    if (Math.abs(difference.value[t]) <= most) continue;
    most = Math.abs(difference.value[t]);
    worst = t;
  }
  if (worst < 0) return null;
  const row = difference.row[worst];
  const col = difference.col[worst];
  return { row, col, value: entry(a, row, col), mirrored: entry(a, col, row) };
}

/** Whether two matrices of one size agree to 1e-10 of their largest entry. */
export function agree(a: Triplets, b: Triplets): boolean {
  const negative = { ...b, value: b.value.map((x) => -x) };
  const allowed = rounding * Math.max(largest(a.value), largest(b.value));
  return add(a, negative).value.every((x) => Math.abs(x) <= allowed);
}

function largest(values: Float64Array): number {
  let most = 0;
  for (const x of values) most = Math.max(most, Math.abs(x));
  return most;
}

function entry(a: Triplets, row: number, col: number): number {
  let sum = 0;
  for (let t = 0; t < a.value.length; t++) if (a.row[t] === row && a.col[t] === col) sum += a.value[t];
  return sum;
}
