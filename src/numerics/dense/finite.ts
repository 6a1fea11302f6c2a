import { NumericalError } from "../../errors.js";

/**
 * Largest modulus among the entries, 0 for none.
 * @throws NumericalError `numerics.not-finite` on NaN or infinity; `what` names the culprit.
 */
export function requireFiniteMaximum(values: Float64Array, what: string): number {
  let largest = 0;
  for (let i = 0; i < values.length; i++) {
    const modulus = Math.abs(values[i]);
    if (!(modulus <= Number.MAX_VALUE)) {
      throw new NumericalError(
        "numerics.not-finite",
        `${what} holds the entry ${values[i]}.`,
        "Check the model for entries so large or small that sums of them overflow or divide by zero.",
      );
    }
    if (modulus > largest) largest = modulus;
  }
  return largest;
}

/** The power of two next above x > 0 (1 for x = 0): dividing by it is exact and brings entries below 1. */
export function powerOfTwoAbove(x: number): number {
  return x === 0 ? 1 : 2 ** Math.min(1023, Math.floor(Math.log2(x)) + 1);
}
