/** A bounded minimisation that needs values only. */
export interface CompassOptions {
  /** First step, as a share of each variable's range. Default 0.25. */
  readonly step: number;
  /** Last step, likewise. Default 0.002. */
  readonly smallestStep: number;
  readonly maximumEvaluations: number;
}

export const compassDefaults: CompassOptions = { step: 0.25, smallestStep: 0.002, maximumEvaluations: 200 };

export interface CompassResult {
  readonly status: "converged" | "evaluations-exhausted";
  readonly x: readonly number[];
  readonly value: number;
  readonly evaluations: number;
}

/**
 * Compass search on [0, 1]ⁿ: tries ± a step along each axis, moves to the first improvement, halves the step when
 * there is none. Slow, but it does not mind kinks.
 *
 * @param start - inside [0, 1]ⁿ, with its value.
 *
 * Source: Kolda, Lewis, Torczon, SIAM Review 45 (2003) §1.
 */
export function compassSearch(
  f: (x: readonly number[]) => number,
  start: readonly number[],
  startValue: number,
  options: CompassOptions = compassDefaults,
): CompassResult {
  let x = [...start];
  let value = startValue;
  let evaluations = 0;
  for (let step = options.step; step >= options.smallestStep; ) {
    let moved = false;
    for (let axis = 0; axis < 2 * x.length && !moved; axis++) {
      const i = axis >> 1;
      const to = Math.min(1, Math.max(0, x[i] + (axis % 2 === 0 ? step : -step)));
      if (to === x[i]) continue;
      if (evaluations >= options.maximumEvaluations)
        return { status: "evaluations-exhausted", x, value, evaluations };
      const trial = x.map((xj, j) => (j === i ? to : xj));
      const trialValue = f(trial);
      evaluations++;
      if (trialValue < value) [x, value, moved] = [trial, trialValue, true];
    }
    if (!moved) step *= 0.5;
  }
  return { status: "converged", x, value, evaluations };
}
