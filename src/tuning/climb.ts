import { sizeOf } from "../margin/measure.js";
import { feasibilityTolerance, type MaximinProblem, maximiseMinimum } from "../optimiser/epigraph.js";
import { Follower } from "./follower.js";
import type { Followed, SearchModel } from "./search-model.js";

/** A design as the reduced model sees it. */
export interface Candidate {
  /** Point of the unit design space. */
  readonly x: readonly number[];
  /** Smallest reduced margin over the operating points looked at. */
  readonly value: number;
}

export interface ClimbOptions {
  /** Half width of the box searched around the start, share of each range. */
  readonly reach: number;
  /** Designs evaluated in one solve of the epigraph problem, as a share of those that a first ascent gets. */
  readonly effort: number;
  /** Accuracy of the margin, relative to its size (`sizeOf`). */
  readonly tolerance: number;
  /** How often the set of active operating points is exchanged at most. */
  readonly exchanges: number;
  /** Indices of variables that keep their value. */
  readonly frozen: ReadonlySet<number>;
}

export interface Climbed extends Candidate {
  /** Operating points that were active in the end. */
  readonly active: readonly ReadonlyMap<string, number>[];
}

/** Of the operating points handed over, those lowest at the start are active at first; the exchange adds what matters. */
const mostStartPoints = 2;

/** Competing peaks followed at each operating point; the rest goes with the nearest of them. */
const slotsPerPoint = 3;

/**
 * Local ascent of the worst margin on the reduced model: epigraph form over the active operating points and
 * their competing peaks, then a search of the envelope, whose worst point joins the active ones,
 * until it brings nothing new.
 */
export async function climb(
  search: SearchModel,
  start: readonly number[],
  active: readonly ReadonlyMap<string, number>[],
  options: ClimbOptions,
): Promise<Climbed> {
  let points = lowest(search, start, active, mostStartPoints);
  let x = [...start];
  for (let exchange = 0; ; exchange++) {
    // After the first solve the active set changes a little, and so does the design.
    const share = exchange === 0 ? 1 : 0.4;
    x = await ascend(search, x, points, {
      ...options,
      reach: share * options.reach,
      effort: share * options.effort,
    });
    const design = search.designs.valuesOf(x);
    const known = Math.min(...points.map((at) => search.estimate(design, at).value));
    const worst = search.worstPoints(design, points, "coarse")[0];
    const slack = options.tolerance * sizeOf(known, search.setting);
    if (worst.value >= known - slack || exchange === options.exchanges) {
      return { x, value: Math.min(known, worst.value), active: points };
    }
    points = [...points.filter((at) => !near(search, at, worst.at)), worst.at];
  }
}

function lowest(
  search: SearchModel,
  x: readonly number[],
  points: readonly ReadonlyMap<string, number>[],
  most: number,
): ReadonlyMap<string, number>[] {
  const design = search.designs.valuesOf(x);
  return points
    .map((at) => ({ at, value: search.estimate(design, at).value }))
    .sort((a, b) => a.value - b.value)
    .slice(0, most)
    .map(({ at }) => at);
}

async function ascend(
  search: SearchModel,
  start: readonly number[],
  points: readonly ReadonlyMap<string, number>[],
  options: ClimbOptions,
): Promise<number[]> {
  const { designs } = search;
  const first = designs.valuesOf(start);
  const followers = points.map((at) => new Follower(search, at));
  const slots = followers.map((follower) => slotFrequencies(follower.at(start, first).criticals));
  const free = start.map((_, i) => i).filter((i) => !options.frozen.has(i));
  if (free.length === 0) return [...start];
  const spread = (z: readonly number[]) => {
    const x = [...start];
    free.forEach((i, k) => {
      x[i] = z[k];
    });
    return x;
  };
  let best = Number.NEGATIVE_INFINITY;
  const problem: MaximinProblem = {
    dimension: free.length,
    pieces: slots.reduce((sum, list) => sum + list.length, 0),
    limits: search.problem.budget.length,
    evaluate: (z) => {
      const x = spread(z);
      const design = designs.valuesOf(x);
      const limits = designs.limitsAt(x);
      let found = followers.map((follower) => follower.at(x, design));
      if (limits.every((g) => g <= feasibilityTolerance) && smallest(found) > best) {
        found = followers.map((follower) => follower.search(x, design));
        best = Math.max(best, smallest(found));
      }
      return {
        pieces: found.flatMap(({ value, criticals }, k) => piecesOf(slots[k], criticals, value)),
        limits,
      };
    },
  };
  const result = await maximiseMinimum(problem, {
    start: free.map((i) => start[i]),
    reach: options.reach,
    maximumEvaluations: Math.ceil(options.effort * evaluationsOf(free.length, options.tolerance)),
    tolerance: options.tolerance,
    unit: search.setting.unit,
  });
  return designs.pullBack(spread(result.x), start);
}

/**
 * Designs a first ascent may evaluate. The linear models of COBYLA take a simplex of n + 1 points and some thirty
 * times as many in all to come near the optimum; each further decade of accuracy costs a few simplices more. With
 * eighteen times as many, two of twelve seeds ended 4 % below the two absorbers' best in `best-designs.test.ts`, and half
 * of 24 missed one absorber's by more than a rough tolerance.
 */
function evaluationsOf(dimension: number, tolerance: number): number {
  const decades = Math.max(0, Math.log10(1e-3 / tolerance));
  return (dimension + 1) * (30 + 6 * decades);
}

function smallest(found: readonly Followed[]): number {
  return Math.min(...found.map(({ value }) => value));
}

function slotFrequencies(criticals: Followed["criticals"]): number[] {
  const chosen = criticals.slice(0, slotsPerPoint).map((critical) => critical.omega);
  return chosen.length === 0 ? [0] : chosen;
}

/** The smallest value among the criticals nearest to each slot; a slot without any takes the largest of all. */
function piecesOf(slots: readonly number[], criticals: Followed["criticals"], value: number): number[] {
  const pieces = new Array<number>(slots.length).fill(Number.POSITIVE_INFINITY);
  let largest = value;
  for (const critical of criticals) {
    let nearest = 0;
    slots.forEach((omega, k) => {
      if (Math.abs(omega - critical.omega) < Math.abs(slots[nearest] - critical.omega)) nearest = k;
    });
    pieces[nearest] = Math.min(pieces[nearest], critical.value);
    largest = Math.max(largest, critical.value);
  }
  return pieces.map((piece) => (Number.isFinite(piece) ? piece : largest));
}

function near(search: SearchModel, a: ReadonlyMap<string, number>, b: ReadonlyMap<string, number>): boolean {
  const [x, y] = [search.operation.unitOf(a), search.operation.unitOf(b)];
  return x.every((xi, i) => Math.abs(xi - y[i]) < 0.05);
}
