import type { Pencil } from "../model/pencil.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import type { Band } from "./band.js";
import type { ChannelGain } from "./channel-gain.js";
import type { Crossing } from "./crossing.js";
import type { Eigenpair } from "./eigenpair.js";
import type { PeakOptions } from "./peaks.js";

/** Where and on what scale a margin is judged; the same for the full and the reduced model. */
export interface Setting {
  readonly band: Band;
  /** s₀ [rad/s], the size of the eigenvalues that matter. */
  readonly shift: number;
  /** ω_ref [rad/s] that makes a growth dimensionless. */
  readonly omegaRef: number;
  /** A margin of this size matters; see `sizeOf`. */
  readonly unit: number;
  readonly peaks: PeakOptions;
}

/** The size of a margin that tolerances are shares of: its own, but never less than the unit, for it may be zero. */
export function sizeOf(value: number, { unit }: Pick<Setting, "unit">): number {
  return Math.max(unit, Math.abs(value));
}

/** One place where the margin may be decided, as a reduced model sees it. */
export type Critical =
  | { readonly kind: "peak"; readonly value: number; readonly omega: number; readonly sigma: number }
  | {
      readonly kind: "eigenvalue" | "crossing";
      readonly value: number;
      readonly re: number;
      readonly omega: number;
      readonly right: ComplexVector;
      readonly left: ComplexVector;
    };

/** What the reduced model says: the smallest value first. An infinite value means that there is no limit. */
export interface Estimate {
  readonly value: number;
  readonly criticals: readonly Critical[];
  /** Eigenvalues with Im ≥ 0 of the model at multiplier 1. */
  readonly eigenvalues: { readonly re: Float64Array; readonly im: Float64Array };
}

/** One critical place examined on the full model. */
export interface Checked {
  readonly value: number;
  readonly omega: number;
  /** Residual or backward error reached, whichever belongs to the kind. */
  readonly error: number;
  readonly converged: boolean;
  /** Real directions that teach the reduced model this place. */
  readonly directions: readonly Float64Array[];
  readonly found:
    | { readonly kind: "peak"; readonly gain: ChannelGain }
    | { readonly kind: "eigenvalue"; readonly pair: Eigenpair }
    | { readonly kind: "crossing"; readonly crossing: Crossing };
}

/**
 * A stability measure. `estimate` searches a reduced model; `check` examines one place on the
 * full model with one factorisation, starting from the reduced vectors. Both get the model as a
 * function of the multiplier of the feeding terms.
 */
export interface Measure {
  readonly name: "radius" | "multiplier" | "decay";
  estimate(pencilAt: (multiplier: number) => DensePencil, setting: Setting): Estimate;
  check(
    pencilAt: (multiplier: number) => Pencil,
    critical: Critical,
    lift: (reduced: ComplexVector) => ComplexVector,
    setting: Setting,
  ): Checked;
}

/** The four real vectors behind a right and a left complex one. */
export function realDirections(x: ComplexVector, y: ComplexVector): Float64Array[] {
  return [x.re, x.im, y.re, y.im];
}
