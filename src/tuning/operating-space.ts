import { compassSearch } from "../optimiser/compass-search.js";
import type { OperatingParameter, Problem } from "../problem/problem.js";

/** A point of the envelope as seen by a search. */
export interface OperatingPoint {
  readonly at: ReadonlyMap<string, number>;
  readonly value: number;
}

/** How hard the envelope is searched: `fine` to judge, `coarse` between two ascents, `local` to follow a known point. */
export type Resolution = "fine" | "coarse" | "local";

/** Lengths are shares of each range. */
const effort: Record<
  Resolution,
  { spacing: number; minima: number; smallestStep: number; evaluations: number }
> = {
  fine: { spacing: 0.25, minima: 2, smallestStep: 0.004, evaluations: 20 },
  coarse: { spacing: 0.5, minima: 1, smallestStep: 0.03, evaluations: 6 },
  local: { spacing: 0.1, minima: 1, smallestStep: 0.004, evaluations: 12 },
};

/** The operating envelope as [0, 1]ⁿ. */
export class OperatingSpace {
  readonly parameters: readonly OperatingParameter[];

  constructor(problem: Problem) {
    this.parameters = problem.envelope;
  }

  get nominal(): Map<string, number> {
    return new Map(this.parameters.map(({ name, nominal }) => [name, nominal]));
  }

  valuesOf(x: readonly number[]): Map<string, number> {
    return new Map(this.parameters.map(({ name, low, high }, i) => [name, low + x[i] * (high - low)]));
  }

  unitOf(at: ReadonlyMap<string, number>): number[] {
    return this.parameters.map(({ name, low, high, nominal }) =>
      high === low ? 0 : ((at.get(name) ?? nominal) - low) / (high - low),
    );
  }

  /** All corners, or for many parameters the two ends of each with the rest in the middle; the middle comes last. */
  get corners(): number[][] {
    const n = this.parameters.length;
    const middle = this.unitOf(this.nominal);
    if (n > 5) {
      const ends = this.parameters.flatMap((_, i) =>
        [0, 1].map((end) => middle.map((m, j) => (j === i ? end : m))),
      );
      return [...ends, middle];
    }
    return [...gridOf(n, [0, 1]), middle];
  }

  /**
   * Low points of f, worst first: a scan, then a compass search from the lowest local minima of scan and known points.
   * `local` scans nothing and starts from the known points alone.
   */
  search(
    f: (at: ReadonlyMap<string, number>) => number,
    known: readonly ReadonlyMap<string, number>[],
    resolution: Resolution,
  ): OperatingPoint[] {
    const n = this.parameters.length;
    if (n === 0) return [{ at: new Map(), value: f(new Map()) }];
    const value = (x: readonly number[]) => f(this.valuesOf(x));
    const { spacing, minima, smallestStep, evaluations } = effort[resolution];
    const starts = [...this.#scanPoints(resolution), ...known.map((at) => this.unitOf(at))];
    const scanned = starts.map((x) => ({ x, value: value(x) })).sort((a, b) => a.value - b.value);
    const lowest: { x: readonly number[]; value: number }[] = [];
    for (const point of scanned) {
      const far = lowest.every(({ x }) => Math.max(...x.map((xi, i) => Math.abs(xi - point.x[i]))) > spacing);
      if (lowest.length < minima && far) lowest.push(point);
    }
    const options = { step: 0.5 * spacing, smallestStep, maximumEvaluations: evaluations * n };
    return lowest
      .map((start) => compassSearch(value, start.x, start.value, options))
      .sort((a, b) => a.value - b.value)
      .map((found) => ({ at: this.valuesOf(found.x), value: found.value }));
  }

  #scanPoints(resolution: Resolution): number[][] {
    const n = this.parameters.length;
    if (resolution === "local") return [];
    if (n > 3) return this.corners;
    if (resolution === "coarse") return gridOf(n, [0, 0.5, 1]);
    return gridOf(n, n === 1 ? [0, 0.125, 0.25, 0.375, 0.5, 0.625, 0.75, 0.875, 1] : [0, 0.25, 0.5, 0.75, 1]);
  }
}

function gridOf(dimension: number, levels: readonly number[]): number[][] {
  let points: number[][] = [[]];
  for (let i = 0; i < dimension; i++)
    points = points.flatMap((point) => levels.map((level) => [...point, level]));
  return points;
}
