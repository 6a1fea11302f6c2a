import { describe, expect, it } from "vitest";
import { compassDefaults, compassSearch } from "../../src/optimiser/compass-search.js";
import { maximiseMinimum } from "../../src/optimiser/epigraph.js";

describe("compass search", () => {
  it("finds the minimum of a quadratic inside the box and at its wall", () => {
    // One search sees two units above its start; callers with less start anew.
    const options = { ...compassDefaults, smallestStep: 1e-4, maximumEvaluations: 2000 };
    const inside = (x: readonly number[]) => (x[0]! - 0.3) ** 2 + 2 * (x[1]! - 0.8) ** 2;
    const found = compassSearch(inside, [0.9, 0.1], inside([0.9, 0.1]), options);
    expect(found.status).toBe("converged");
    // Within the last step along each axis.
    expect(found.x[0]).toBeCloseTo(0.3, 3);
    expect(found.x[1]).toBeCloseTo(0.8, 3);
    const slope = (x: readonly number[]) => x[0]! - 3 * x[1]!;
    expect(compassSearch(slope, [0.4, 0.4], slope([0.4, 0.4]), options).x).toEqual([0, 1]);
  });

  it("does not mind a kink along an axis, and never returns worse than its start", () => {
    const kink = ([a, b]: readonly number[]) => Math.abs(a! - 0.25) + 3 * Math.abs(b! - 0.75);
    const found = compassSearch(kink, [1, 0], kink([1, 0]), {
      ...compassDefaults,
      smallestStep: 1e-3,
      maximumEvaluations: 500,
    });
    expect(found.value).toBeLessThan(5e-3);
    const flat = compassSearch(() => 1, [0.5], 1);
    expect(flat).toMatchObject({ x: [0.5], value: 1, status: "converged" });
  });

  it("stops at its last evaluation", () => {
    let count = 0;
    const f = (x: readonly number[]) => {
      count++;
      return (x[0]! - 0.123456) ** 2;
    };
    const found = compassSearch(f, [1], 1, { step: 0.25, smallestStep: 1e-12, maximumEvaluations: 7 });
    expect(found.status).toBe("evaluations-exhausted");
    expect(count).toBe(7);
    expect(found.evaluations).toBe(7);
  });
});

// One search sees two units above its start; callers with less start anew.
const options = { reach: 1, maximumEvaluations: 400, tolerance: 1e-6, unit: 4 };

describe("the epigraph search", () => {
  it("finds the best of smooth pieces that meet in a kink", async () => {
    // max min(1 + x, 2 − x, …): lines meet at x = 0.5 with value 1.5; the second variable has its own optimum.
    const problem = {
      dimension: 2,
      pieces: 3,
      limits: 0,
      evaluate: (x: readonly number[]) => ({
        pieces: [1 + x[0]!, 2 - x[0]!, 3 - 4 * (x[1]! - 0.7) ** 2],
        limits: [],
      }),
    };
    const found = await maximiseMinimum(problem, { ...options, start: [0.05, 0.1] });
    expect(found.value).toBeCloseTo(1.5, 4);
    expect(found.x[0]).toBeCloseTo(0.5, 4);
  });

  it("solves Rosen and Suzuki's problem, put into the unit box: 44 at (0, 1, 2, −1)", async () => {
    // Hock & Schittkowski, Test Examples for Nonlinear Programming Codes, 1981, problem 43; optimum −44.
    const problem = {
      dimension: 4,
      pieces: 1,
      limits: 3,
      evaluate: (unit: readonly number[]) => {
        const [a, b, c, d] = unit.map((u) => 6 * u - 3) as [number, number, number, number];
        const objective = a * a + b * b + 2 * c * c + d * d - 5 * a - 5 * b - 21 * c + 7 * d;
        return {
          pieces: [-objective],
          limits: [
            (a * a + b * b + c * c + d * d + a - b + c - d - 8) / 8,
            (a * a + 2 * b * b + c * c + 2 * d * d - a - d - 10) / 10,
            (2 * a * a + b * b + c * c + 2 * a - b - d - 5) / 5,
          ],
        };
      },
    };
    const start = [0.5, 0.5, 0.5, 0.5];
    const found = await maximiseMinimum(problem, { ...options, start, unit: 60, maximumEvaluations: 3000 });
    expect(found.value).toBeCloseTo(44, 2);
    const wanted = [0, 1, 2, -1];
    found.x.forEach((u, i) => {
      expect(6 * u - 3).toBeCloseTo(wanted[i]!, 1);
    });
  });

  it("returns a point that keeps the limits, the best one met", async () => {
    const problem = {
      dimension: 2,
      pieces: 1,
      limits: 1,
      evaluate: (x: readonly number[]) => ({ pieces: [x[0]! + 2 * x[1]!], limits: [x[0]! + x[1]! - 1] }),
    };
    const found = await maximiseMinimum(problem, { ...options, start: [0.2, 0.2] });
    expect(found.value).toBeCloseTo(2, 4);
    expect(found.x[0]! + found.x[1]!).toBeLessThanOrEqual(1 + 1e-9);
  });

  it("takes infinite pieces, none feasible, and few evaluations for what they are", async () => {
    const infinite = {
      dimension: 1,
      pieces: 2,
      limits: 0,
      evaluate: (x: readonly number[]) => ({ pieces: [Number.POSITIVE_INFINITY, x[0]!], limits: [] }),
    };
    expect((await maximiseMinimum(infinite, { ...options, start: [0.1] })).value).toBeCloseTo(1, 4);
    const impossible = { ...infinite, limits: 1, evaluate: () => ({ pieces: [1, 1], limits: [1] }) };
    expect((await maximiseMinimum(impossible, { ...options, start: [0.1] })).value).toBe(
      Number.NEGATIVE_INFINITY,
    );
    const few = await maximiseMinimum(infinite, { ...options, start: [0.1], maximumEvaluations: 3 });
    expect(few.evaluations).toBeLessThanOrEqual(4);
    expect(few.status).toBe("evaluations-exhausted");
  });

  it("passes on an error of the function", async () => {
    const broken = {
      dimension: 1,
      pieces: 1,
      limits: 0,
      evaluate: (x: readonly number[]) => {
        if (x[0]! > 0.5) throw new RangeError("beyond");
        return { pieces: [x[0]!], limits: [] };
      },
    };
    await expect(maximiseMinimum(broken, { ...options, start: [0.4] })).rejects.toThrow(RangeError);
  });
});
