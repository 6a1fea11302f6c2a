/**
 * Symmetric scaling by powers of two, so that the largest entry of every row and column of
 * D A D comes near 1. Displacements and rotations differ by powers of ten, and a pivot
 * threshold means something only between comparable entries. Powers of two round nothing.
 *
 * Source: Ruiz, RAL-TR-2001-034, 2001 (simultaneous scaling by square roots of the maxima).
 */

import type { SparsePattern } from "./sparse-matrix.js";

const SWEEPS = 5;
/** Beyond these exponents products of two factors would leave the range of doubles. */
const LARGEST_EXPONENT = 400;

/**
 * @param modulus - Moduli of the entries, in the order of the pattern.
 * @returns The exponents e, D = diag(2^e), one per row; 0 for an empty row and column.
 */
export function equilibrationExponents(pattern: SparsePattern, modulus: Float64Array): Int32Array {
  const { cols, colStart, rowIndex } = pattern;
  const logModulus = modulus.map((m) => (m > 0 ? Math.log2(m) : Number.NEGATIVE_INFINITY));
  const exponent = new Float64Array(cols);
  const largest = new Float64Array(cols);
  for (let sweep = 0; sweep < SWEEPS; sweep++) {
    largest.fill(Number.NEGATIVE_INFINITY);
    for (let j = 0; j < cols; j++) {
      for (let p = colStart[j]; p < colStart[j + 1]; p++) {
        const i = rowIndex[p];
        const m = logModulus[p] + exponent[i] + exponent[j];
        if (m > largest[i]) largest[i] = m;
        if (m > largest[j]) largest[j] = m;
      }
    }
    for (let j = 0; j < cols; j++) if (largest[j] > Number.NEGATIVE_INFINITY) exponent[j] -= largest[j] / 2;
  }
  return Int32Array.from(exponent, (e) =>
    Math.round(Math.max(-LARGEST_EXPONENT, Math.min(LARGEST_EXPONENT, e))),
  );
}
