import { describe, expect, it } from "vitest";
import { FullModel } from "../../src/fullorder/full-model.js";
import { decay } from "../../src/margin/decay.js";
import type { Measure } from "../../src/margin/measure.js";
import { multiplier } from "../../src/margin/multiplier.js";
import { marginAt, settingOf } from "../../src/margin/point-margin.js";
import { radius } from "../../src/margin/radius.js";
import { AdaptiveModel } from "../../src/reduction/adaptive-model.js";
import { type Case, diagonal, modelOf, problemOf } from "./model-cases.js";

const inf = Number.POSITIVE_INFINITY;

function ask(given: Case, measure: Measure) {
  const { model, state } = modelOf(given);
  const adaptive = new AdaptiveModel(new FullModel(model), state, null);
  return marginAt(adaptive, measure, new Map(), settingOf(problemOf(given).margin, adaptive));
}

const condensed = 3 - 0.5;
// The massless dof (stiffness 2, coupled by −1) follows statically: dof 0 is a mass on 2.5 with d = 0.1. At its
// resonance the response of both is that of dof 0 times √(1 + ¼) on both sides of H, and the static ½ beside it.
const cases: readonly (readonly [string, Case, number, number, number])[] = [
  // Name, model, radius, multiplier, damping ratio.
  ["one mass", { mass: [[1]], damping: [[0.1]], stiffness: [[1]] }, 0.1 * Math.sqrt(1 - 0.0025), inf, 0.05],
  ["overdamped", { mass: [[1]], damping: [[3]], stiffness: [[2]] }, 2, inf, 1],
  ["critically damped", { mass: [[1]], damping: [[2]], stiffness: [[1]] }, 1, inf, 1],
  [
    "three critically damped at once",
    { mass: diagonal([1, 1, 1]), damping: diagonal([2, 2, 2]), stiffness: diagonal([1, 1, 1]) },
    1,
    inf,
    1,
  ],
  [
    "three equal modes",
    { mass: diagonal([1, 1, 1]), damping: diagonal([0.1, 0.1, 0.1]), stiffness: diagonal([1, 1, 1]) },
    0.1 * Math.sqrt(1 - 0.0025),
    inf,
    0.05,
  ],
  ["no damping", { mass: diagonal([1, 1]), stiffness: diagonal([1, 4]) }, 0, inf, 0],
  ["no mass", { mass: diagonal([0, 0]), damping: diagonal([1, 2]), stiffness: diagonal([3, 4]) }, 3, inf, 1],
  ["a free body with damping", { mass: [[1]], damping: [[0.1]], stiffness: [[0]] }, 0, inf, 0],
  ["a free body", { mass: [[1]], stiffness: [[0]] }, 0, inf, 0],
  ["B = 0", { mass: [[1]], damping: [[0.1]], stiffness: [[1]], left: [[0]] }, inf, inf, 0.05],
  ["no declared error", { mass: [[1]], damping: [[0.1]], stiffness: [[1]], acts: "none" }, inf, inf, 0.05],
  [
    "a massless dof",
    {
      mass: diagonal([1, 0]),
      damping: diagonal([0.1, 0]),
      stiffness: [
        [3, -1],
        [-1, 2],
      ],
    },
    Number.NaN,
    inf,
    0.05 / Math.sqrt(condensed),
  ],
  [
    "divergence of one dof",
    { mass: [[1]], damping: [[0.3]], stiffness: [[5]], circulatory: [[-2]] },
    3,
    2.5,
    0.3 / (2 * Math.sqrt(3)),
  ],
  [
    "negative damping",
    {
      mass: diagonal([1, 1]),
      damping: diagonal([0.1, 0.1]),
      stiffness: diagonal([1, 4]),
      frictional: diagonal([-0.3, 0]),
    },
    -0.1,
    1 / 3,
    -0.1,
  ],
];

describe.each(cases)("%s", (_, given, r, alpha, zeta) => {
  it("has its radius", async () => {
    const point = await ask(given, radius);
    expect(point.doubts).toEqual([]);
    if (r < 0) {
      // Minus the growth 0.1 over ω_ref, whatever that is.
      expect(point.value).toBeLessThan(0);
      expect(point.stability.abscissa).toBeCloseTo(-r, 12);
    } else if (given.circulatory !== undefined) {
      // c√(4mk − c²)/(2m) with k = 3, the peak at ω > 0.
      expect(point.value).toBeCloseTo((0.3 * Math.sqrt(12 - 0.09)) / 2, 10);
    } else if (Number.isNaN(r)) {
      expect(point.value).toBeCloseTo(0.1 * Math.sqrt(condensed) * 0.8, 2);
    } else if (r === inf) expect(point.value).toBe(inf);
    else expect(point.value).toBeCloseTo(r, 10);
  });

  it("has its multiplier", async () => {
    const point = await ask(given, multiplier);
    expect(point.doubts).toEqual([]);
    if (alpha === inf) expect(point.value).toBe(inf);
    else expect(point.value).toBeCloseTo(alpha, 10);
  });

  it("has its damping ratio", async () => {
    const point = await ask(given, decay("ratio"));
    expect(point.doubts).toEqual([]);
    // A defective eigenvalue is known to √eps.
    expect(point.value).toBeCloseTo(zeta, 7);
  });
});
