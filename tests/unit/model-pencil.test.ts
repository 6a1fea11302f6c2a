import { describe, expect, it } from "vitest";
import { energyForm } from "../../src/fullorder/energy-form.js";
import { FullModel } from "../../src/fullorder/full-model.js";
import { countModesBelow, naturalModes } from "../../src/fullorder/natural-modes.js";
import { buildModel, stateAt } from "../../src/model/parametric-model.js";
import { entrySlots, mergedPattern } from "../../src/model/pattern.js";
import {
  applyPencil,
  applyPencilAdjoint,
  applyPencilDerivative,
  pencilNorm,
} from "../../src/model/pencil.js";
import { innerProduct, norm2 } from "../../src/numerics/dense/complex-vectors.js";
import { complexVector } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";
import type { Problem } from "../../src/problem/problem.js";
import { AdaptiveModel } from "../../src/reduction/adaptive-model.js";
import {
  companionEigenvalues,
  diagonal,
  formula,
  modelOf,
  pencilOf,
  problemOf,
  randomCase,
} from "./model-cases.js";

function randomVector(n: number, seed: number) {
  const random = createRandom(seed);
  const x = complexVector(n);
  for (let i = 0; i < n; i++) [x.re[i], x.im[i]] = [random.normal(), random.normal()];
  return x;
}

describe("the merged pattern", () => {
  it("is structurally symmetric with a full diagonal and holds every entry", () => {
    const a = fromTriplets(4, 4, [0, 2, 3], [1, 0, 3], [1, 2, 3]);
    const b = fromTriplets(4, 4, [3], [1], [5]);
    const pattern = mergedPattern(4, [a, b]);
    const places = new Set<string>();
    for (let j = 0; j < 4; j++)
      for (let p = pattern.colStart[j]!; p < pattern.colStart[j + 1]!; p++)
        places.add(`${pattern.rowIndex[p]},${j}`);
    for (let i = 0; i < 4; i++) expect(places.has(`${i},${i}`)).toBe(true);
    for (const place of places) expect(places.has(place.split(",").reverse().join(","))).toBe(true);
    expect(places.size).toBe(4 + 6);
    const slots = entrySlots(pattern, a);
    a.values.forEach((_, p) => {
      expect(pattern.rowIndex[slots[p]!]).toBe(a.rowIndex[p]);
    });
  });
});

describe("the parametric model", () => {
  it("leaves out fixed dofs everywhere and keeps their numbers", () => {
    const given = { ...randomCase(1, 5, 2, 2), gyroscopic: diagonal([0, 0, 0, 0, 0]) };
    const model = buildModel(problemOf(given, { fixed: Int32Array.of(0, 3) }));
    expect(model.order).toBe(3);
    expect(Array.from(model.freeDofs)).toEqual([1, 2, 4]);
    const pencil = new FullModel(model).pencilAt(stateAt(model, new Map()));
    const kept = (rows: readonly (readonly number[])[]) =>
      [1, 2, 4].map((i) => [1, 2, 4].map((j) => rows[i]![j]!));
    const small = pencilOf({
      mass: kept(given.mass!),
      damping: kept(given.damping!),
      stiffness: kept(given.stiffness!),
      circulatory: kept(given.circulatory!),
      left: [1, 2, 4].map((i) => given.left![i]!),
      right: given.right!.map((row) => [1, 2, 4].map((j) => row[j]!)),
    });
    const x = randomVector(3, 2);
    const [y, z] = [applyPencil(pencil, 0.2, 1.3, x), applyPencil(small, 0.2, 1.3, x)];
    y.re.forEach((value, i) => {
      expect(value).toBeCloseTo(z.re[i]!, 12);
    });
    expect(pencil.input.cols).toBe(2);
  });

  it("refuses a model without a free dof", () => {
    expect(() => buildModel(problemOf({ mass: [[1]] }, { fixed: Int32Array.of(0) }))).toThrow(/fixed/);
  });

  it("scales its feeding terms, or the terms named, with the multiplier", () => {
    const given = { mass: [[1]], damping: [[2]], stiffness: [[3]], circulatory: [[4]], frictional: [[5]] };
    const base = problemOf(given);
    const coefficients = (problem: Problem, multiplier: number) => {
      const model = buildModel(problem);
      return Array.from(stateAt(model, new Map(), multiplier).coefficients);
    };
    expect(coefficients(base, 7)).toEqual([1, 1, 1, 7, 7]);
    expect(coefficients({ ...base, margin: { ...base.margin, terms: ["damping"] } }, 7)).toEqual([
      1, 7, 1, 1, 1,
    ]);
  });

  it("evaluates factors and sizes at its values", () => {
    const base = problemOf({ mass: [[1]], stiffness: [[1]] });
    const problem: Problem = {
      ...base,
      terms: base.terms.map((term) => ({ ...term, factor: formula("2*a + b", ["a", "b"]) })),
      perturbations: base.perturbations.map((block) => ({ ...block, size: formula("a^2", ["a"]) })),
    };
    const state = stateAt(
      buildModel(problem),
      new Map([
        ["a", 3],
        ["b", 0.5],
      ]),
    );
    expect(Array.from(state.coefficients)).toEqual([6.5, 6.5]);
    expect(Array.from(state.sizes)).toEqual([9]);
  });
});

describe("the full pencil", () => {
  const given = randomCase(7, 12, 3, 2);
  const { model, state } = modelOf(given);
  const full = new FullModel(model);
  const pencil = full.pencilAt(state);
  const dense = pencilOf(given);

  it("is the dense one: products, adjoint, derivative, solves", () => {
    const x = randomVector(12, 1);
    const y = randomVector(12, 2);
    const [a, b] = [applyPencil(pencil, 0.3, 2, x), applyPencil(dense, 0.3, 2, x)];
    expect(
      norm2({ re: a.re.map((v, i) => v - b.re[i]!), im: a.im.map((v, i) => v - b.im[i]!) }),
    ).toBeLessThan(1e-12);
    // yᴴ(P x) = (Pᴴ y)ᴴ x.
    const left = innerProduct(y, a);
    const right = innerProduct(applyPencilAdjoint(pencil, 0.3, 2, y), x);
    expect(left.re).toBeCloseTo(right.re, 10);
    expect(left.im).toBeCloseTo(right.im, 10);
    // P′ by a central difference, exact for a quadratic.
    const h = 0.5;
    const [p, m] = [applyPencil(pencil, 0.3 + h, 2, x), applyPencil(pencil, 0.3 - h, 2, x)];
    const d = applyPencilDerivative(pencil, 0.3, 2, x);
    expect(d.re[5]).toBeCloseTo((p.re[5]! - m.re[5]!) / (2 * h), 10);
    expect(d.im[5]).toBeCloseTo((p.im[5]! - m.im[5]!) / (2 * h), 10);
    expect(norm2(a)).toBeLessThanOrEqual(pencilNorm(pencil, 0.3, 2) * norm2(x));
    const before = full.counts.complex;
    const solution = { rows: 12, cols: 1, re: a.re.slice(), im: a.im.slice() };
    expect(pencil.factor(0.3, 2).solveInPlace(solution)).toBeLessThan(1e-14);
    expect(full.counts.complex).toBe(before + 1);
    solution.re.forEach((value, i) => {
      expect(value).toBeCloseTo(x.re[i]!, 10);
    });
  });

  it("counts real modes by inertia as another library has them", () => {
    const undamped = companionEigenvalues(pencilOf({ mass: given.mass!, stiffness: given.stiffness! }))
      .filter(({ im }) => im > 0)
      .map(({ im }) => im);
    for (const omega of [1, 1.8, 2.2, 9])
      expect(countModesBelow(pencil, omega)).toEqual({
        count: undamped.filter((own) => own < omega).length,
        reliable: true,
      });
    const top = 2.2;
    const { count } = countModesBelow(pencil, top);
    const modes = naturalModes(pencil, top, energyForm(pencil, 1), count);
    expect(modes.complete).toBe(true);
    undamped
      .filter((own) => own < top)
      .sort((a, b) => a - b)
      .forEach((own, k) => {
        expect(Math.sqrt(modes.lambda[k]!)).toBeCloseTo(own, 8);
      });
  });
});

describe("the energy form", () => {
  it("shifts a free body until it is definite", () => {
    const { model, state } = modelOf({
      mass: diagonal([1, 1]),
      stiffness: [
        [1, -1],
        [-1, 1],
      ],
    });
    const energy = energyForm(new FullModel(model).pencilAt(state), 0.1);
    expect(energy.definite).toBe(true);
    expect(energy.sigma).toBeCloseTo(0.01, 15);
  });

  it("falls back to a diagonal where a massless dof has negative stiffness, and measures plainly without M and K", () => {
    const indefinite = modelOf({ mass: diagonal([1, 0]), stiffness: diagonal([1, -2]) });
    const energy = energyForm(new FullModel(indefinite.model).pencilAt(indefinite.state), 1);
    expect(energy.definite).toBe(false);
    expect(energy.matrix.values.every((value) => value > 0)).toBe(true);
    const first = modelOf({ damping: diagonal([1, 1]), circulatory: diagonal([1, 2]) });
    const plain = energyForm(new FullModel(first.model).pencilAt(first.state), 1);
    expect(Array.from(plain.matrix.values)).toEqual([1, 1]);
  });
});

describe("the adaptive model", () => {
  it("carries a small model whole: the reduced one has the same eigenvalues", () => {
    const given = randomCase(9, 6, 1, 1);
    const { model, state } = modelOf(given);
    const adaptive = new AdaptiveModel(new FullModel(model), state, null);
    expect(adaptive.exact).toBe(true);
    expect(adaptive.searchedTo).toBe(Number.POSITIVE_INFINITY);
    const own = companionEigenvalues(adaptive.reducedAt(state));
    for (const { re, im } of companionEigenvalues(pencilOf(given)))
      expect(Math.min(...own.map((value) => Math.hypot(value.re - re, value.im - im)))).toBeLessThan(1e-10);
    adaptive.enrich([new Float64Array(6).fill(1)]);
    adaptive.addSample(state);
    expect(adaptive.order).toBe(6);
  });

  it.each([
    ["one dof", { mass: [[1]], stiffness: [[1]] }],
    ["no stiffness", { mass: [[1]], damping: [[1]], stiffness: [[0]] }],
    ["first order", { damping: [[1]], circulatory: [[2]] }],
    ["mass alone", { mass: [[3]] }],
  ])("starts from %s", (_, given) => {
    const { model, state } = modelOf(given);
    const adaptive = new AdaptiveModel(new FullModel(model), state, null);
    expect(adaptive.order).toBe(1);
    expect(adaptive.shift).toBeGreaterThan(0);
  });
});
