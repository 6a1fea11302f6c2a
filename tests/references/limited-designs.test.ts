/**
 * Designs under limits whose best is known in closed form [E]: one mass under a damping-like error survives exactly its
 * own dashpot, r = c; a rotor with cross-coupling q has the critical multiplier c√(k/m)/q (Childs 1993).
 */

import { describe, expect, it } from "vitest";
import { entries, model, type Questions, tuned } from "./through-files.js";

const oneMass = (design: Questions["design"], damping: string, cost: string, limit: number): Questions => ({
  title: "one mass",
  dofs: 1,
  matrices: { one: entries([[1]]) },
  constants: { k: 100 },
  design: design!,
  terms: {
    mass: [{ matrix: "one" }],
    stiffness: [{ matrix: "one", factor: "k" }],
    damping: [{ matrix: "one", factor: damping }],
  },
  perturbations: [
    { name: "dashpot", acts: "damping", kind: "complex", left: [[1, 1]], right: [[1, 1]], size: 1 },
  ],
  margin: { measure: "radius" },
  budget: { cost: { formula: cost, limit } },
  tune: { seed: 1, tolerance: 1e-6 },
});

describe("a stepped dashpot", () => {
  it("ends on the highest purchasable step that the budget allows", async () => {
    const result = await tuned(oneMass({ c: { range: [0.5, 5.5], start: 0.5, step: 0.8 } }, "c", "c", 3));
    expect(result.design["c"]).toBeCloseTo(2.9, 12);
    expect(result.margin.value).toBeCloseTo(2.9, 8);
    expect(result.rounded).toBe(true);
    expect(result.status).toBe("trusted");
  });

  it("leaves what it cannot use to a continuous one", async () => {
    const design = { a: { range: [0, 3], start: 0, step: 1 }, b: { range: [0, 1], start: 0.1 } } as const;
    const result = await tuned(
      oneMass(
        { a: { ...design.a, range: [0, 3] }, b: { ...design.b, range: [0, 1] } },
        "a + b",
        "a + 2*b",
        4,
      ),
    );
    expect(result.design["a"]).toBe(3);
    expect(result.design["b"]).toBeCloseTo(0.5, 5);
    expect(result.margin.value).toBeCloseTo(3.5, 5);
    expect(result.budget["cost"]!.used).toBeLessThanOrEqual(4 * (1 + 1e-9));
  });
});

it("a budget that nothing keeps is infeasible, and the least violated design is shown", async () => {
  const result = await tuned(oneMass({ c: { range: [2, 5], start: 4 } }, "c", "c", 1));
  expect(result.status).toBe("infeasible");
  expect(result.design["c"]).toBe(2);
  expect(result.budget["cost"]).toMatchObject({ used: 2, limit: 1 });
  expect(result.margin.value).toBeCloseTo(2, 8);
});

describe("a rotor that starts unstable", () => {
  const rotor = (measure: "multiplier" | "radius"): Questions => ({
    title: "rotor",
    ...model({
      M: [
        [1, 0],
        [0, 1],
      ],
      D: [
        [1, 0],
        [0, 1],
      ],
      K: [
        [100, 0],
        [0, 100],
      ],
      N: [
        [0, 20],
        [-20, 0],
      ],
    }),
    terms: {
      mass: [{ matrix: "M" }],
      stiffness: [{ matrix: "K" }],
      damping: [{ matrix: "D", factor: "c" }],
      circulatory: [{ matrix: "N" }],
    },
    design: { c: { range: [0.5, 8], start: 0.5 } },
    perturbations: [
      { name: "seal", acts: "stiffness", kind: "complex", left: "identity", right: "identity", size: 1 },
    ],
    margin: { measure },
    budget: { cost: { formula: "c", limit: 4 } },
    tune: { seed: 1, tolerance: 1e-6 },
  });

  it("is tuned through the loss of stability by the multiplier", async () => {
    const result = await tuned(rotor("multiplier"));
    expect(result.before.margin.value).toBeCloseTo(0.25, 9);
    expect(result.margin.value).toBeCloseTo(2, 6);
    expect(result.design["c"]).toBeCloseTo(4, 6);
  });

  it("is tuned from a growth to a radius without a cliff", async () => {
    const result = await tuned(rotor("radius"));
    expect(result.before.margin.value).toBeLessThan(0);
    expect(result.before.unperturbed.stable).toBe(false);
    // Circular symmetry: P(iω) = (k − ω² + iωc) I + N has the singular values |k − ω² + iωc ± iq|, least near ω = √k
    // where c ω − q = 20, up to the shift of the minimum.
    expect(result.margin.value).toBeGreaterThan(0);
    expect(result.margin.value).toBeLessThanOrEqual(20);
    expect(result.design["c"]).toBeCloseTo(4, 6);
    expect(result.unperturbed.stable).toBe(true);
  });
});
