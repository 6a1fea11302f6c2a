import { describe, expect, it } from "vitest";
import { createRandom } from "../../src/numerics/random.js";
import type { Problem } from "../../src/problem/problem.js";
import { DesignSpace } from "../../src/tuning/design-space.js";
import { OperatingSpace } from "../../src/tuning/operating-space.js";
import { screen } from "../../src/tuning/screen.js";
import { Session } from "../../src/tuning/session.js";
import { formula, problemOf } from "./model-cases.js";

const names = ["a", "b", "c"];
const variable = (name: string, low: number, high: number, step: number | null = null) => ({
  name,
  low,
  high,
  start: low,
  step,
  unit: "",
});

function withDesign(more: Partial<Problem> = {}): Problem {
  return problemOf(
    { mass: [[1]], damping: [[0.1]], stiffness: [[1]] },
    {
      design: [variable("a", 0, 10), variable("b", -1, 1), variable("c", 2, 2)],
      budget: [
        { name: "cost", formula: formula("2*a + b + 1", names), limit: 9, unit: "" },
        { name: "balance", formula: formula("b - 0.5", names), limit: 0, unit: "" },
      ],
      ...more,
    },
  );
}

describe("the design space", () => {
  const space = new DesignSpace(withDesign());

  it("maps the unit box to values and back, constants of zero width to 0", () => {
    const values = space.valuesOf([0.3, 0.25, 0]);
    expect([...values]).toEqual([
      ["a", 3],
      ["b", -0.5],
      ["c", 2],
    ]);
    expect(space.unitOf(values)).toEqual([0.3, 0.25, 0]);
    expect(space.start).toEqual([0, 0, 0]);
    expect(space.unitOf(new Map([["a", 5]]))).toEqual([0.5, 0, 0]);
  });

  it("measures limits without dimension, and by themselves where the limit is zero", () => {
    // 2·3 − 0.5 + 1 = 6.5 of 9; −0.5 − 0.5.
    const [cost, balance] = space.limitsAt([0.3, 0.25, 0]);
    expect(cost).toBeCloseTo(6.5 / 9 - 1, 14);
    expect(balance).toBe(-1);
    expect(space.useOf(space.valuesOf([0.3, 0.25, 0])).get("cost")).toEqual({
      used: 6.5,
      limit: 9,
      unit: "",
    });
  });

  it("pulls a design back just to its limits, and leaves feasible ones alone", () => {
    expect(space.pullBack([0.1, 0.1, 0], [0, 0, 0])).toEqual([0.1, 0.1, 0]);
    const x = space.pullBack([1, 0.5, 0], [0, 0, 0]);
    expect(space.isFeasible(x)).toBe(true);
    expect(space.limitsAt(x)[0]).toBeCloseTo(0, 8);
  });

  it("fills the budget at random, the same for the same seed", () => {
    const draw = (seed: number) => {
      const random = createRandom(seed);
      return Array.from({ length: 40 }, (_, k) => space.randomFilling(random, [0, 0, 0], k % 2 === 0));
    };
    const designs = draw(4);
    expect(draw(4)).toEqual(designs);
    expect(draw(5)).not.toEqual(designs);
    for (const x of designs) {
      expect(space.isFeasible(x)).toBe(true);
      // Either a limit is met or the wall of the box; a sparse draw may pick no axis at all and stay at the anchor.
      if (x.every((value) => value === 0)) continue;
      const full = Math.max(...space.limitsAt(x)) > -1e-6 || Math.max(...x) > 1 - 1e-9;
      expect(full).toBe(true);
    }
  });

  it("finds a feasible point where there is one, else the least violated", () => {
    const narrow = new DesignSpace(
      withDesign({
        budget: [{ name: "narrow", formula: formula("abs(a - 7) + abs(b)", names), limit: 0.5, unit: "" }],
      }),
    );
    expect(narrow.isFeasible(narrow.leastViolated(createRandom(1), 2000))).toBe(true);
    const impossible = new DesignSpace(
      withDesign({ budget: [{ name: "none", formula: formula("a + 5", names), limit: 4, unit: "" }] }),
    );
    const x = impossible.leastViolated(createRandom(1), 50);
    expect(impossible.isFeasible(x)).toBe(false);
    expect(x[0]).toBe(0);
  });

  it("lists steps below and above, nearest first, inside the range", () => {
    const stepped = new DesignSpace(
      withDesign({ design: [variable("a", 0, 10, 3), variable("b", -1, 1), variable("c", 2, 2, 1)] }),
    );
    expect(stepped.isStepped).toBe(true);
    expect(space.isStepped).toBe(false);
    const list = stepped.steppedNeighbours([0.97, 0.4, 0], 10).map(([a]) => 10 * a!);
    // 9.7 lies above the last step, 9.
    expect(list).toHaveLength(1);
    expect(list[0]).toBeCloseTo(9, 12);
    const two = stepped.steppedNeighbours([0.4, 0.4, 0], 10).map(([a]) => 10 * a!);
    expect(two[0]).toBeCloseTo(3, 12);
    expect(two[1]).toBeCloseTo(6, 12);
  });
});

const range = (name: string, low: number, high: number) => ({
  name,
  low,
  high,
  nominal: 0.5 * (low + high),
  unit: "",
});

describe("the envelope", () => {
  const spaceOf = (count: number) =>
    new OperatingSpace(
      withDesign({ envelope: Array.from({ length: count }, (_, i) => range(`o${i}`, 0, 10)) }),
    );
  const at = (values: ReadonlyMap<string, number>) => [...values.values()];

  it("of nothing is one point", () => {
    expect(spaceOf(0).search(() => 3, [], "fine")).toEqual([{ at: new Map(), value: 3 }]);
  });

  it("has its corners, or for many parameters the ends of each, and the middle last", () => {
    expect(spaceOf(2).corners).toHaveLength(5);
    expect(spaceOf(6).corners).toHaveLength(13);
    expect(spaceOf(2).corners.at(-1)).toEqual([0.5, 0.5]);
  });

  it("is searched to a minimum inside, on a wall, and in the lower of two valleys", () => {
    const inside = spaceOf(2).search((v) => (at(v)[0]! - 3.3) ** 2 + (at(v)[1]! - 7.1) ** 2, [], "fine");
    // The last step is 0.004 of the range.
    expect(at(inside[0]!.at)[0]).toBeCloseTo(3.3, 1);
    expect(at(inside[0]!.at)[1]).toBeCloseTo(7.1, 1);
    expect(at(spaceOf(2).search((v) => at(v)[0]! - at(v)[1]!, [], "coarse")[0]!.at)).toEqual([0, 10]);
    const valleys = (v: ReadonlyMap<string, number>) => {
      const x = at(v)[0]!;
      return Math.min((x - 1.5) ** 2, (x - 8.2) ** 2 - 0.3);
    };
    const found = spaceOf(1).search(valleys, [], "fine");
    expect(found).toHaveLength(2);
    expect(found[0]!.value).toBeCloseTo(-0.3, 2);
    expect(found[1]!.value).toBeCloseTo(0, 2);
  });

  it("follows a known point that the scan does not meet", () => {
    const needle = (v: ReadonlyMap<string, number>) =>
      Math.abs(at(v)[0]! - 6.6) < 0.3 ? -1 - (0.3 - Math.abs(at(v)[0]! - 6.6)) : 0;
    expect(spaceOf(1).search(needle, [], "coarse")[0]!.value).toBe(0);
    expect(spaceOf(1).search(needle, [new Map([["o0", 6.5]])], "local")[0]!.value).toBeLessThan(-1.2);
  });
});

describe("screening", () => {
  const problem = withDesign({
    terms: problemOf({ mass: [[1]], damping: [[0.1]], stiffness: [[1]] }).terms.map((term) =>
      term.group === "damping" ? { ...term, factor: formula("1 + a", names) } : term,
    ),
  });

  it("is the same for the same seed, keeps the best, apart from each other, all within the limits", async () => {
    const session = new Session(problem, new DesignSpace(problem).valuesOf([0, 0, 0]));
    const run = (seed: number) =>
      screen(session, [new Map()], [0, 0, 0], 40, 4, createRandom(seed), () => undefined);
    const found = await run(3);
    expect(await run(3)).toEqual(found);
    expect(found.length).toBeGreaterThan(1);
    found.forEach(({ x, value }, k) => {
      expect(session.designs.isFeasible(x)).toBe(true);
      expect(value).toBe(session.estimate(session.designs.valuesOf(x), new Map()).value);
      if (k > 0) expect(value).toBeLessThanOrEqual(found[k - 1]!.value);
      for (const other of found.slice(0, k))
        expect(Math.max(...x.map((xi, i) => Math.abs(xi - other.x[i]!)))).toBeGreaterThanOrEqual(0.05);
    });
  });
});
