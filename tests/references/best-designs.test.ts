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
