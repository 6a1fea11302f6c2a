import { invariant } from "../../errors.js";
import { balance } from "./balance.js";
import { powerOfTwoAbove, requireFiniteMaximum } from "./finite.js";
import { reduceToHessenberg } from "./hessenberg.js";
import type { DenseMatrix } from "./matrix.js";

/** D⁻¹ A D = unit · Q H Qᵀ with H of norm about 1, ready for the QR iteration. */
export interface BalancedHessenberg {
  /** H and below its subdiagonal the reflectors of Q, as `reduceToHessenberg` leaves them. */
  readonly h: Float64Array;
  readonly tau: Float64Array;
  /** The diagonal of D. */
  readonly weights: Float64Array;
  /** Two powers of two whose product is the unit of H: it alone might overflow. */
  readonly unit: readonly [number, number];
}

/** Balances a real square matrix, scales it to norm 1 and reduces it to Hessenberg form. */
export function balancedHessenberg(a: DenseMatrix): BalancedHessenberg {
  invariant(a.rows === a.cols, `eigenvalues of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const outer = powerOfTwoAbove(requireFiniteMaximum(a.values, "A matrix whose eigenvalues are wanted"));
  // `map` of a typed array takes longer than some of the algebra.
  const h = a.values.slice();
  for (let i = 0; i < h.length; i++) h[i] /= outer;
  const weights = balance(h, null, n);
  // Balancing shrinks; the tests of the iteration expect norm about 1.
  const inner = powerOfTwoAbove(requireFiniteMaximum(h, "A balanced matrix"));
  if (inner !== 1) for (let i = 0; i < h.length; i++) h[i] /= inner;
  const tau = new Float64Array(n);
  reduceToHessenberg(h, n, tau);
  return { h, tau, weights, unit: [inner, outer] };
}

/** Clears H below its subdiagonal, once the reflectors are no longer needed. */
export function clearReflectors(h: Float64Array, n: number): void {
  for (let j = 0; j < n; j++) h.fill(0, j * n + Math.min(j + 2, n), (j + 1) * n);
}

/** Eigenvalues of H made those of A, in place. */
export function inUnits(
  re: Float64Array,
  im: Float64Array,
  [inner, outer]: readonly [number, number],
): { readonly re: Float64Array; readonly im: Float64Array } {
  for (let j = 0; j < re.length; j++) {
    re[j] = re[j] * inner * outer;
    im[j] = im[j] * inner * outer;
  }
  return { re, im };
}
