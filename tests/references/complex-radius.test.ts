import { readFileSync } from "node:fs";
import { describe, expect, it } from "vitest";
import type { ProblemFile } from "../../src/problem/problem-file.js";
import { marginOf, model, omegaOf } from "./through-files.js";

interface OneMass {
  readonly m: number;
  readonly c: number;
  readonly k: number;
}
interface Values {
  readonly oneMass: { readonly cases: readonly OneMass[] };
  readonly damping: {
    readonly M: number[][];
    readonly K: number[][];
    readonly cases: readonly { readonly D: number[][]; readonly radius: number; readonly omega: number }[];
  };
}
const values: Values = JSON.parse(readFileSync(new URL("complex-radius.json", import.meta.url), "utf8"));

/** A peak is flat: its height known to eps leaves its frequency known to √eps, times what its sharpness allows. */
const frequencyDigits = 2e-7;

function oneMass({ m, c, k }: OneMass, acts: "stiffness" | "damping") {
  const error = { name: "error", acts, left: [[1, 1]], right: [[1, 1]], size: 1, kind: "complex" };
  return marginOf({
    ...model({ M: [[m]], D: [[c]], K: [[k]] }),
    perturbations: [error] as ProblemFile["perturbations"] & object,
    margin: { measure: "radius" },
  });
}

describe("one mass", () => {
  it.each(values.oneMass.cases)(
    "m = $m, c = $c, k = $k has the stiffness-like radius in closed form",
    async (of) => {
      const { m, c, k } = of;
      const result = await oneMass(of, "stiffness");
      const resonant = c * c < 2 * m * k;
      const radius = resonant ? (c * Math.sqrt(4 * m * k - c * c)) / (2 * m) : k;
      // The audit accepts 1e-9 between two evaluations; a closed form is met to rounding.
      expect(Math.abs(result.margin.value! / radius - 1)).toBeLessThan(1e-12);
      expect(result.status).toBe("trusted");
      const omega = omegaOf(result)!;
      if (resonant) {
        expect(Math.abs(omega / Math.sqrt(k / m - (c * c) / (2 * m * m)) - 1)).toBeLessThan(frequencyDigits);
        expect(result.margin.loss).toBe("flutter");
      } else {
        expect(omega).toBe(0);
        expect(result.margin.loss).toBe("divergence");
      }
    },
  );

  it.each(values.oneMass.cases)(
    "m = $m, c = $c, k = $k has the damping-like radius c at √(k/m)",
    async (of) => {
      const result = await oneMass(of, "damping");
      expect(Math.abs(result.margin.value! / of.c - 1)).toBeLessThan(1e-12);
      expect(Math.abs(omegaOf(result)! / Math.sqrt(of.k / of.m) - 1)).toBeLessThan(frequencyDigits);
      expect(result.status).toBe("trusted");
    },
  );
});

it.each(values.damping.cases)("damping-like over all dofs: radius $radius", async ({ D, radius, omega }) => {
  const { M, K } = values.damping;
  const result = await marginOf({
    ...model({ M, D, K }),
    perturbations: [
      { name: "error", acts: "damping", left: "identity", right: "identity", size: 1, kind: "complex" },
    ],
    margin: { measure: "radius" },
  });
  // Half a unit of the last digit given.
  expect(Math.abs(result.margin.value! - radius)).toBeLessThan(6e-13);
  expect(Math.abs(omegaOf(result)! - omega)).toBeLessThan(2e-8);
  expect(result.status).toBe("trusted");
});
