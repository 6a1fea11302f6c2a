import nlopt from "nlopt-js";

// Before anything else: a thread that computes or waits for long while this is under way has it complain.
await nlopt.ready;

/** max over x of the smallest of several pieces, subject to limits: the shape of every worst-case design. */
export interface MaximinProblem {
  readonly dimension: number;
  readonly pieces: number;
  readonly limits: number;
  /** Piece values (any scale) and limits g(x) ≤ 0 (dimensionless) at x in [0, 1]ⁿ; infinite pieces are allowed. */
  evaluate(x: readonly number[]): { readonly pieces: readonly number[]; readonly limits: readonly number[] };
}

export interface MaximinOptions {
  readonly start: readonly number[];
  /** Half width of the box around the start in which is searched, share of the range; 1 is everywhere. */
  readonly reach: number;
  readonly maximumEvaluations: number;
  /** Accuracy wanted in the smallest piece, relative to the larger of its size and the unit. */
  readonly tolerance: number;
  /** Size of a piece that matters. */
  readonly unit: number;
}

export interface MaximinResult {
  readonly status: "converged" | "evaluations-exhausted" | "failed";
  readonly x: readonly number[];
  /** Smallest piece at x; −Infinity when no feasible point was met. */
  readonly value: number;
  readonly evaluations: number;
}

/** Violation of a limit below which a point counts as feasible. */
export const feasibilityTolerance = 1e-9;

/** Pieces further above the start's smallest, in its scale, are all alike. */
const ceiling = 4;

/**
 * Epigraph form: maximise τ over (x, τ) subject to piece_j(x) ≥ τ and g(x) ≤ 0, by COBYLA. The plain
 * minimum has kinks that stall linear models; in epigraph form each piece stays smooth.
 * The best feasible point met is returned, whatever the method ended with.
 *
 * Source: Powell, A direct search optimization method that models the objective and constraint
 * functions by linear interpolation, 1994; implementation of the nlopt-js package.
 */
export async function maximiseMinimum(
  problem: MaximinProblem,
  options: MaximinOptions,
): Promise<MaximinResult> {
  const { dimension: n } = problem;
  const memory = new PointMemory(problem);
  const first = memory.at(options.start);
  const lowest = Math.min(...first.pieces);
  const level = Number.isFinite(lowest) ? lowest : options.unit;
  // The method sees (piece − level)/scale, so that its trust region has one shape in x and τ.
  const scale = Math.max(0.5 * options.unit, Math.abs(level));
  // A limit is asked for with a little to spare: the method ends on it to its own accuracy only.
  const spare = 1e-7;
  const optimiser = new nlopt.Optimize(nlopt.Algorithm.LN_COBYLA, n + 1);
  optimiser.setMaxObjective((z: number[]) => z[n], 0.1 * options.tolerance);
  for (let j = 0; j < problem.pieces; j++) {
    optimiser.addInequalityConstraint(
      (z: number[]) => z[n] - Math.min((memory.at(z).pieces[j] - level) / scale, ceiling),
      1e-8,
    );
  }
  for (let l = 0; l < problem.limits; l++) {
    optimiser.addInequalityConstraint((z: number[]) => memory.at(z).limits[l] + spare, 1e-8);
  }
  optimiser.setLowerBounds([...options.start.map((x) => Math.max(0, x - options.reach)), -2]);
  optimiser.setUpperBounds([...options.start.map((x) => Math.min(1, x + options.reach)), 2]);
  // COBYLA asks for each constraint by itself; the memory answers all of a point at once.
  optimiser.setMaxeval(options.maximumEvaluations);
  let status: MaximinResult["status"] = "converged";
  try {
    optimiser.optimize([...options.start, 0]);
    if (memory.evaluations >= options.maximumEvaluations) status = "evaluations-exhausted";
  } catch {
    // nlopt-js reports its own failures (round-off limits among them) as bare numbers.
    status = "failed";
  } finally {
    nlopt.GC.flush();
  }
  if (memory.failure !== undefined) throw memory.failure;
  return { status, x: memory.bestX, value: memory.bestValue, evaluations: memory.evaluations };
}

/** Remembers the last point's values, the best feasible point, and an error thrown inside the foreign code. */
class PointMemory {
  readonly #problem: MaximinProblem;
  #x: readonly number[] = [];
  #last: { readonly pieces: readonly number[]; readonly limits: readonly number[] } = {
    pieces: [],
    limits: [],
  };
  bestX: readonly number[] = [];
  bestValue = Number.NEGATIVE_INFINITY;
  evaluations = 0;
  failure: unknown;

  constructor(problem: MaximinProblem) {
    this.#problem = problem;
  }

  at(z: readonly number[]) {
    const x = z.slice(0, this.#problem.dimension).map((value) => Math.min(1, Math.max(0, value)));
    if (this.failure !== undefined) return this.#last;
    if (this.evaluations > 0 && x.every((value, i) => value === this.#x[i])) return this.#last;
    try {
      this.#last = this.#problem.evaluate(x);
    } catch (error) {
      // Thrown through the foreign code it would leave that in ruins, and its own error would hide this one.
      if (this.evaluations === 0) throw error;
      this.failure = error;
      return this.#last;
    }
    this.#x = x;
    this.evaluations++;
    const value = Math.min(...this.#last.pieces);
    const feasible = this.#last.limits.every((g) => g <= feasibilityTolerance);
    if ((feasible && value > this.bestValue) || this.bestX.length === 0) {
      this.bestX = x;
      if (feasible) this.bestValue = value;
    }
    return this.#last;
  }
}
