import { readFileSync } from "node:fs";
import { describe, expect, it } from "vitest";
import { type Questions, tuned } from "./through-files.js";

const values = JSON.parse(
  readFileSync(new URL("best-designs.json", import.meta.url), "utf8"),
) as typeof import("./best-designs.json");

const force: NonNullable<Questions["perturbations"]> = [
  { name: "error", acts: "stiffness", left: [[1, 1]], right: [[1, 1]], size: 1, kind: "complex" },
];

/** An absorber of mass 0.05 on a mass and a spring of 1, its spring and dashpot free within two decades. */
function absorber(spring: number, dashpot: number, seed = 1): Questions {
  return {
    dofs: 2,
    matrices: {
      primary: { entries: [[1, 1, 1]] },
      secondary: { entries: [[2, 2, values.absorber.mass]] },
      ground: { links: [[1, 0, 1]] },
      link: { links: [[1, 2, 1]] },
    },
    design: {
      spring: { range: [0.002, 0.2], start: spring },
      dashpot: { range: [0.0005, 0.1], start: dashpot },
    },
    terms: {
      mass: [{ matrix: "primary" }, { matrix: "secondary" }],
      damping: [{ matrix: "link", factor: "dashpot" }],
      stiffness: [{ matrix: "ground" }, { matrix: "link", factor: "spring" }],
    },
    perturbations: force,
    margin: { measure: "radius" },
    tune: { tolerance: 1e-9, seed },
  };
}

describe("absorber on one mass", () => {
  const starts = [
    { name: "stiff and overdamped", spring: 0.19, dashpot: 0.09 },
    { name: "soft and nearly undamped", spring: 0.003, dashpot: 0.0006 },
    { name: "well tuned but undamped", spring: 0.045, dashpot: 0.0005 },
  ];

  it.each(starts)(
    "is tuned to the published optimum from a start that is $name",
    async ({ spring, dashpot }) => {
      const result = await tuned(absorber(spring, dashpot));
      const { mass, smallestPeak, tuning, ratio } = values.absorber;
      expect(Math.abs(result.margin.value! * smallestPeak - 1)).toBeLessThan(1e-7);
      const found = { spring: result.design["spring"]!, dashpot: result.design["dashpot"]! };
      const f = Math.sqrt(found.spring / mass);
      const zeta = found.dashpot / (2 * mass * f);
      expect(Math.abs(f / tuning - 1)).toBeLessThan(1e-4);
      expect(Math.abs(zeta / ratio - 1)).toBeLessThan(1e-4);
      expect(result.status).toBe("trusted");
      expect(result.before.margin.value!).toBeLessThan(0.7 * result.margin.value!);
    },
  );

  it("is found with another seed too, and the same design again with the same seed", async () => {
    const [first, again, other] = [
      await tuned(absorber(0.19, 0.09, 3)),
      await tuned(absorber(0.19, 0.09, 3)),
      await tuned(absorber(0.19, 0.09, 4)),
    ];
    expect(again.design).toEqual(first.design);
    expect(Math.abs(other.margin.value! * values.absorber.smallestPeak - 1)).toBeLessThan(1e-7);
  });

  it("is found to the tolerance asked for, when that is rough", async () => {
    const rough = await tuned({ ...absorber(0.19, 0.09), tune: { tolerance: 1e-3 } });
    expect(Math.abs(rough.margin.value! * values.absorber.smallestPeak - 1)).toBeLessThan(1e-3);
    expect(rough.status).toBe("trusted");
  });

  it("is found as well when the margin is a small number, for its target tells the scale", async () => {
    const size = 1e4;
    const result = await tuned({
      ...absorber(0.19, 0.09),
      perturbations: [{ ...force[0]!, size }],
      margin: { measure: "radius", target: 1.5e-5 },
      tune: { tolerance: 1e-6 },
    });
    expect(Math.abs(size * result.margin.value! * values.absorber.smallestPeak - 1)).toBeLessThan(1e-6);
    expect(result.status).toBe("trusted");
  });
});

describe("two absorbers on one mass", () => {
  const [first, second] = [1, 2];
  const problem = (seed: number): Questions => ({
    dofs: 3,
    matrices: {
      primary: { entries: [[1, 1, 1]] },
      secondary: { entries: [first, second].map((i): [number, number, number] => [i + 1, i + 1, 0.025]) },
      ground: { links: [[1, 0, 1]] },
      link1: { links: [[1, 2, 1]] },
      link2: { links: [[1, 3, 1]] },
    },
    design: {
      spring1: { range: [0.001, 0.1], start: 0.07 },
      dashpot1: { range: [0.0001, 0.05], start: 0.04 },
      spring2: { range: [0.001, 0.1], start: 0.05 },
      dashpot2: { range: [0.0001, 0.05], start: 0.04 },
    },
    terms: {
      mass: [{ matrix: "primary" }, { matrix: "secondary" }],
      damping: [first, second].map((i) => ({ matrix: `link${i}`, factor: `dashpot${i}` })),
      stiffness: [
        { matrix: "ground" },
        ...[first, second].map((i) => ({ matrix: `link${i}`, factor: `spring${i}` })),
      ],
    },
    perturbations: force,
    margin: { measure: "radius" },
    tune: { tolerance: 1e-9, seed },
  });

  it.each([1, 2, 3])("end at the same margin whatever the seed, here %d", async (seed) => {
    const result = await tuned(problem(seed));
    expect(Math.abs(result.margin.value! / values.twoAbsorbers.radius - 1)).toBeLessThan(1e-7);
    expect(result.margin.value!).toBeGreaterThan(1.1 / values.absorber.smallestPeak);
    expect(result.status).toBe("trusted");
    // The three blended peaks at the optimum are equally high; a search that overlooks one promises more.
    const promised = result.history.at(-1)!.full;
    expect(Math.abs(promised / result.margin.value! - 1)).toBeLessThan(1e-8);
  });
});

describe("a limit on damping shared by separate masses", () => {
  it("gives all the same ratio, found to a thousandth of one per cent by default", async () => {
    const { m, k, limit } = values.shared;
    const numbers = m.map((_, i) => i + 1);
    const result = await tuned({
      dofs: m.length,
      matrices: Object.fromEntries(numbers.map((i) => [`unit${i}`, { entries: [[i, i, 1]] }])),
      design: Object.fromEntries(numbers.map((i) => [`c${i}`, { range: [0, 0.1], start: 0.001 * i }])),
      terms: {
        mass: numbers.map((i) => ({ matrix: `unit${i}`, factor: m[i - 1]! })),
        damping: numbers.map((i) => ({ matrix: `unit${i}`, factor: `c${i}` })),
        stiffness: numbers.map((i) => ({ matrix: `unit${i}`, factor: k[i - 1]! })),
      },
      margin: { measure: "decay", as: "ratio" },
      budget: { damping: { formula: numbers.map((i) => `c${i}`).join(" + "), limit } },
    });
    const best = limit / (2 * m.reduce((sum, mass, i) => sum + Math.sqrt(mass * k[i]!), 0));
    expect(best).toBeLessThan(1e-3);
    expect(best - result.margin.value!).toBeLessThan(1e-5);
    expect(result.margin.value!).toBeLessThanOrEqual(best * (1 + 1e-9));
    expect(result.status).toBe("trusted");
  });
});

describe("one dashpot to ground", () => {
  const { m, k } = values.plateau;
  const problem = (c: number, tolerance: number): Questions => ({
    dofs: 1,
    matrices: { unit: { entries: [[1, 1, 1]] } },
    constants: { m, k },
    design: { c: { range: [0.1, 40], start: c } },
    terms: {
      mass: [{ matrix: "unit", factor: "m" }],
      damping: [{ matrix: "unit", factor: "c" }],
      stiffness: [{ matrix: "unit", factor: "k" }],
    },
    perturbations: force,
    margin: { measure: "radius" },
    tune: { tolerance },
  });

  it.each([
    [0.1, 1e-3],
    [0.1, 1e-9],
    [39, 1e-3],
  ])("from c = %d reaches the plateau r = k, tolerance %d", async (c, tolerance) => {
    const result = await tuned(problem(c, tolerance));
    expect(Math.abs(result.margin.value! / k - 1)).toBeLessThan(1e-12);
    expect(result.design["c"]!).toBeGreaterThanOrEqual(Math.sqrt(2 * m * k));
    expect(result.margin).toMatchObject({ breaksAtHz: 0, loss: "divergence" });
    expect(result.status).toBe("trusted");
  });
});
