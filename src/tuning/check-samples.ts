import { createRandom, type Random } from "../numerics/random.js";
import type { Problem, TermGroup } from "../problem/problem.js";

/** A point of design box × envelope at which the model is assembled. */
export interface CheckPoint {
  readonly kind: "nominal" | "corner" | "random";
  /** Design variables and operating parameters by name. */
  readonly at: ReadonlyMap<string, number>;
}

export interface CheckPoints {
  /** The start design at the nominal operating point first. */
  readonly points: readonly CheckPoint[];
  /** Every combination of ends of the parameters in M, D and K is among them. */
  readonly allCorners: boolean;
}

interface Range {
  readonly name: string;
  readonly low: number;
  readonly high: number;
}

const mostCorners = 16;
const symmetricGroups: ReadonlySet<TermGroup> = new Set(["mass", "damping", "stiffness"]);

/**
 * Where the model is checked: the start design at the nominal point, the corners over the parameters that terms use
 * — all while they are at most 16, otherwise 16 seeded ones with all-low and all-high among them —
 * and seeded random points. Parameters of M, D and K come first: what is left over sits at a random end.
 */
export function checkPoints(problem: Problem, randomPoints: number): CheckPoints {
  const random = createRandom(problem.tune.seed);
  const centre = new Map([
    ...problem.design.map(({ name, start }) => [name, start] as const),
    ...problem.envelope.map(({ name, nominal }) => [name, nominal] as const),
  ]);
  const { ranges, symmetric } = movingRanges(problem);
  const points: CheckPoint[] = [{ kind: "nominal", at: centre }];
  const place = (kind: CheckPoint["kind"], levels: readonly number[]): void => {
    const moved = ranges.map(({ name, low, high }, i) => [name, between(low, high, levels[i])] as const);
    points.push({ kind, at: new Map([...centre, ...moved]) });
  };
  if (ranges.length > 0) {
    for (const levels of corners(ranges.length, random)) place("corner", levels);
    for (let k = 0; k < randomPoints; k++)
      place(
        "random",
        ranges.map(() => random.uniform()),
      );
  }
  return { points, allCorners: 2 ** symmetric <= mostCorners };
}

/** The end itself at level 1: a formula may be defined there and not a rounding beyond. */
function between(low: number, high: number, level: number): number {
  return level === 1 ? high : low + level * (high - low);
}

/** Parameters with room to move that some term uses, those of M, D and K first. */
function movingRanges({ terms, design, envelope }: Problem): { ranges: Range[]; symmetric: number } {
  const all = new Set(terms.flatMap(({ factor }) => factor.names));
  const first = new Set(
    terms.filter(({ group }) => symmetricGroups.has(group)).flatMap(({ factor }) => factor.names),
  );
  const moving = [...design, ...envelope].filter(({ name, low, high }) => low < high && all.has(name));
  const leading = moving.filter(({ name }) => first.has(name));
  const ranges = [...leading, ...moving.filter(({ name }) => !first.has(name))];
  return { ranges, symmetric: leading.length };
}

/** Ends (0, 1) of n parameters: all combinations of the first four at most, or 16 distinct seeded ones. */
function corners(n: number, random: Random): number[][] {
  const end = () => random.integer(2);
  const enumerated = Math.min(n, Math.log2(mostCorners));
  const list: number[][] = Array.from({ length: 2 ** enumerated }, (_, mask) =>
    Array.from({ length: n }, (_, i) => (i < enumerated ? (mask >> i) & 1 : end())),
  );
  if (n <= enumerated) return list;
  list[0].fill(0);
  list[list.length - 1].fill(1);
  return list;
}
