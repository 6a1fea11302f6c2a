import type { Random } from "../numerics/random.js";
import { feasibilityTolerance } from "../optimiser/epigraph.js";
import type { Problem, Variable } from "../problem/problem.js";

/** How much of one limit a design uses. */
export interface LimitUse {
  readonly used: number;
  readonly limit: number;
  readonly unit: string;
}

/** A variable this close to an end of its range (share of the range) is put on it: no layer of a nanometre. */
const atEnd = 1e-6;

/**
 * The designs of a problem as points of [0, 1]ⁿ, with its limits as dimensionless functions
 * g = used/|limit| − limit/|limit| ≤ 0 (used itself where the limit is 0).
 */
export class DesignSpace {
  readonly variables: readonly Variable[];
  readonly #problem: Problem;

  constructor(problem: Problem) {
    this.#problem = problem;
    this.variables = problem.design;
  }

  get dimension(): number {
    return this.variables.length;
  }

  /** Design values by name; what a search leaves within a billionth of an end is put on it. */
  valuesOf(x: readonly number[]): Map<string, number> {
    return new Map(
      this.variables.map(({ name, low, high }, i) => {
        if (x[i] < atEnd) return [name, low];
        return [name, x[i] > 1 - atEnd ? high : low + x[i] * (high - low)];
      }),
    );
  }

  unitOf(values: ReadonlyMap<string, number>): number[] {
    return this.variables.map(({ name, low, high, start }) =>
      high === low ? 0 : ((values.get(name) ?? start) - low) / (high - low),
    );
  }

  get start(): number[] {
    return this.unitOf(new Map(this.variables.map(({ name, start }) => [name, start])));
  }

  limitsAt(x: readonly number[]): number[] {
    return [...this.useOf(this.valuesOf(x)).values()].map(({ used, limit }) =>
      limit === 0 ? used : used / Math.abs(limit) - Math.sign(limit),
    );
  }

  useOf(design: ReadonlyMap<string, number>): Map<string, LimitUse> {
    const values = new Map([...this.#problem.constants, ...design]);
    return new Map(
      this.#problem.budget.map(({ name, formula, limit, unit }) => [
        name,
        { used: formula.evaluate(values), limit, unit },
      ]),
    );
  }

  isFeasible(x: readonly number[], tolerance: number = feasibilityTolerance): boolean {
    return this.limitsAt(x).every((g) => g <= tolerance);
  }

  /** The point moved towards a feasible one just far enough to be feasible itself. */
  pullBack(x: readonly number[], feasible: readonly number[]): number[] {
    if (this.isFeasible(x)) return [...x];
    let [low, high] = [0, 1];
    const at = (t: number) => x.map((xi, i) => feasible[i] + t * (xi - feasible[i]));
    for (let bisection = 0; bisection < 60; bisection++) {
      const middle = 0.5 * (low + high);
      if (this.isFeasible(at(middle))) low = middle;
      else high = middle;
    }
    return at(low);
  }

  /**
   * The least violated of many seeded points; feasible if any is. Where every variable is best at its lower end, as
   * mass and cost usually are, that corner is among them.
   */
  leastViolated(random: Random, tries: number): number[] {
    const n = this.dimension;
    const candidates = [this.start, new Array<number>(n).fill(0), new Array<number>(n).fill(1)];
    for (let k = 0; k < tries; k++) candidates.push(Array.from({ length: n }, () => random.uniform()));
    const violation = (x: readonly number[]) => Math.max(0, ...this.limitsAt(x));
    return candidates.reduce((best, x) => (violation(x) < violation(best) ? x : best));
  }

  /** A random design that fills the budget: a ray from a feasible anchor, every other one along few axes only. */
  randomFilling(random: Random, anchor: readonly number[], sparse: boolean): number[] {
    const n = this.dimension;
    const share = sparse ? Math.max(1, Math.round(n / 3)) / n : 1;
    const target = Array.from({ length: n }, () => (random.uniform() < share ? random.uniform() : 0));
    const longest = Math.max(...target, 1e-12);
    return this.pullBack(
      target.map((t) => t / longest),
      anchor,
    );
  }

  /** Steps below and above each stepped variable, all combinations (at most `most`), the nearest first. */
  steppedNeighbours(x: readonly number[], most: number): number[][] {
    let list: number[][] = [[...x]];
    this.variables.forEach(({ low, high, step }, i) => {
      if (step === null || high === low) return;
      const steps = (x[i] * (high - low)) / step;
      const last = Math.floor((high - low) / step + 1e-9);
      const near = [Math.round(steps), Math.floor(steps), Math.ceil(steps)].map((k) =>
        Math.min(last, Math.max(0, k)),
      );
      const choices = [...new Set(near)].map((k) => Math.min(1, (k * step) / (high - low)));
      list = list
        .flatMap((y) => choices.map((choice) => y.map((yj, j) => (j === i ? choice : yj))))
        .slice(0, 8 * most);
    });
    const distance = (y: readonly number[]) => Math.hypot(...y.map((yj, j) => yj - x[j]));
    return list.sort((a, b) => distance(a) - distance(b)).slice(0, most);
  }

  get isStepped(): boolean {
    return this.variables.some(({ step }) => step !== null);
  }
}
