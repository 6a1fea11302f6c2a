import type { ModelState } from "../model/parametric-model.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import type { AdaptiveModel } from "../reduction/adaptive-model.js";
import { liftBy } from "./lift.js";
import { type Checked, type Critical, type Estimate, type Measure, type Setting, sizeOf } from "./measure.js";

export interface SettleOptions {
  /** Largest accepted gap between reduced and full value, relative to the margin's size (`sizeOf`). Default 1e-9. */
  readonly tolerance: number;
  /** Full checks at most. Default 20. */
  readonly maximumChecks: number;
  /** Criticals whose value is within this factor of the smallest are all checked. Default 1/0.7. */
  readonly competing: number;
}

export const settleDefaults: SettleOptions = { tolerance: 1e-9, maximumChecks: 20, competing: 1 / 0.7 };

/** One full check beside what the reduced model had said. */
export interface CheckRecord {
  readonly omega: number;
  readonly reduced: number;
  readonly full: number;
  readonly order: number;
}

/** A margin at one point on which the reduced and the full model agree. */
export interface Settled {
  readonly status: "converged" | "stalled";
  /** The full model's value; Infinity when there is no limit. */
  readonly value: number;
  /** The place that decides; undefined when there is none. */
  readonly decisive: Checked | undefined;
  readonly estimate: Estimate;
  readonly records: readonly CheckRecord[];
}

/**
 * The greedy loop at one point: search the reduced model, examine its most critical place on the full
 * one, learn from it, and stop when both agree there and at every competing place.
 *
 * Source: Aliyev, Benner, Mengi, Schwerdtner, Voigt, SIAM J. Matrix Anal. Appl. 38 (2017).
 */
export function settle(
  adaptive: AdaptiveModel,
  measure: Measure,
  stateAt: (multiplier: number) => ModelState,
  setting: Setting,
  options: SettleOptions = settleDefaults,
): Settled {
  const records: CheckRecord[] = [];
  const agreed: Checked[] = [];
  const fullAt = (multiplier: number) => adaptive.full.pencilAt(stateAt(multiplier));
  for (;;) {
    const estimate = measure.estimate((multiplier) => adaptive.reducedAt(stateAt(multiplier)), setting);
    const next = competitors(estimate, options).find(
      (critical) => !agreed.some((known) => sameplace(known, critical, setting)),
    );
    const done = next === undefined;
    if (done || records.length >= options.maximumChecks) return conclude(done, agreed, estimate, records);
    const lift = (reduced: ComplexVector) => liftBy(adaptive.basis, reduced);
    const checked = measure.check(fullAt, next, lift, setting);
    records.push({ omega: next.omega, reduced: next.value, full: checked.value, order: adaptive.order });
    const gap = Math.abs(next.value - checked.value);
    // A refuted place has the value Infinity, and an infinite gap: it must not pass for agreement on an infinite size.
    const agrees =
      checked.converged && Number.isFinite(gap) && gap <= options.tolerance * sizeOf(checked.value, setting);
    if (agrees) agreed.push(checked);
    const before = adaptive.order;
    adaptive.enrich(checked.directions);
    // Nothing learnt and nothing agreed: the next turn would be this one again.
    if (!agrees && adaptive.order === before) return conclude(false, agreed, estimate, records);
  }
}

/** Criticals that could decide: those within the competing factor of the smallest value. */
function competitors(estimate: Estimate, options: SettleOptions): readonly Critical[] {
  const { value, criticals } = estimate;
  const bound = value > 0 ? value * options.competing : value / options.competing;
  return criticals.filter((critical, k) => k === 0 || critical.value <= bound);
}

function sameplace(known: Checked, critical: Critical, setting: Setting): boolean {
  const near = Math.abs(known.omega - critical.omega) <= 1e-6 * Math.max(known.omega, critical.omega, 1e-9);
  return near && Math.abs(known.value - critical.value) <= 1e-6 * sizeOf(known.value, setting);
}

function conclude(
  done: boolean,
  agreed: readonly Checked[],
  estimate: Estimate,
  records: readonly CheckRecord[],
): Settled {
  const decisive = agreed.reduce<Checked | undefined>(
    (best, checked) => (best === undefined || checked.value < best.value ? checked : best),
    undefined,
  );
  const status = done ? "converged" : "stalled";
  return { status, value: decisive?.value ?? estimate.value, decisive, estimate, records };
}
