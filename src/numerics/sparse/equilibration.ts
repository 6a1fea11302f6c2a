/**
 * Symmetric scaling by powers of two, so that the largest entry of every row and column of
 * D A D comes near 1. Displacements and rotations differ by powers of ten, and a pivot
 * threshold means something only between comparable entries. Powers of two round nothing.
 *
 * Source: Ruiz, RAL-TR-2001-034, 2001 (simultaneous scaling by square roots of the maxima).
 */

import type { SparsePattern } from "./sparse-matrix.js";

const MOST_SWEEPS = 5;
/** Binary orders of magnitude by which a maximum may miss 1 when the sweeps end early; rounding to powers of two misses it by as much. */
const CLOSE_ENOUGH = 1;
/** Beyond these exponents products of two factors would leave the range of doubles. */
const LARGEST_EXPONENT = 400;

/**
 * @param modulus - Moduli of the entries, in the order of the pattern.
 * @returns The exponents e, D = diag(2^e), one per row; 0 for an empty row and column.
 */
export function equilibrationExponents(pattern: SparsePattern, modulus: Float64Array): Int32Array {
  const { cols } = pattern;
  const logModulus = binaryLogarithms(modulus);
  const exponent = new Float64Array(cols);
  const largest = new Float64Array(cols);
  for (let sweep = 0; sweep < MOST_SWEEPS; sweep++) {
    largestInto(largest, pattern, logModulus, exponent);
    let worst = 0;
    for (let j = 0; j < cols; j++) {
      if (largest[j] === Number.NEGATIVE_INFINITY) continue;
      exponent[j] -= largest[j] / 2;
      worst = Math.max(worst, Math.abs(largest[j]));
    }
    if (worst <= CLOSE_ENOUGH) break;
  }
  return Int32Array.from(exponent, (e) =>
    Math.round(Math.max(-LARGEST_EXPONENT, Math.min(LARGEST_EXPONENT, e))),
  );
}

/**
 * log₂ to within 0.09, −∞ for zero: the high word of a double is its logarithm with the
 * mantissa as a straight line between powers of two.
 */
function binaryLogarithms(modulus: Float64Array): Float64Array {
  const words = new Int32Array(modulus.buffer, modulus.byteOffset, 2 * modulus.length);
  const high = IS_LITTLE_ENDIAN ? 1 : 0;
  const result = new Float64Array(modulus.length);
  for (let p = 0; p < modulus.length; p++) {
    result[p] = modulus[p] > 0 ? words[2 * p + high] / 2 ** 20 - 1023 : Number.NEGATIVE_INFINITY;
  }
  return result;
}

const IS_LITTLE_ENDIAN: boolean = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

/** Largest entry of every row and column of D A D, as logarithms. */
function largestInto(
  largest: Float64Array,
  { cols, colStart, rowIndex }: SparsePattern,
  logModulus: Float64Array,
  exponent: Float64Array,
): void {
  largest.fill(Number.NEGATIVE_INFINITY);
  for (let j = 0; j < cols; j++) {
    const own = exponent[j];
    let most = largest[j];
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const i = rowIndex[p];
      const m = logModulus[p] + exponent[i] + own;
      if (m > largest[i]) largest[i] = m;
      if (m > most) most = m;
    }
    if (most > largest[j]) largest[j] = most;
  }
}
