import { describe, expect, it } from "vitest";
import { FullModel } from "../../src/fullorder/full-model.js";
import { bandOf, inBand } from "../../src/margin/band.js";
import { refineCrossing } from "../../src/margin/crossing.js";
import { decay, decayOf } from "../../src/margin/decay.js";
import { refineEigenpair } from "../../src/margin/eigenpair.js";
import { verdictOf } from "../../src/margin/full-stability.js";
import { multiplier } from "../../src/margin/multiplier.js";
import { type DiscEffort, nearbyEigenvalues } from "../../src/margin/nearby-eigenvalues.js";
import { powerBalance } from "../../src/margin/power-balance.js";
import { radius } from "../../src/margin/radius.js";
import { isUnstable } from "../../src/margin/stability.js";
import { witnessOf } from "../../src/margin/witness.js";
import { applyPencil, applyPencilAdjoint, pencilNorm } from "../../src/model/pencil.js";
import { norm2 } from "../../src/numerics/dense/complex-vectors.js";
import { complexVector } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import type { DensePencil } from "../../src/reduction/reduced-model.js";
import {
  type Case,
  companionEigenvalues,
  definite,
  diagonal,
  modelOf,
  pencilOf,
  randomCase,
  settingFor,
} from "./model-cases.js";

const inf = Number.POSITIVE_INFINITY;

function randomVector(n: number, seed: number) {
  const random = createRandom(seed);
  const x = complexVector(n);
  for (let i = 0; i < n; i++) [x.re[i], x.im[i]] = [random.normal(), random.normal()];
  return x;
}

const identity = (x: ReturnType<typeof complexVector>) => x;

describe("inverse iteration", () => {
  it.each([1, 2, 3])("finds an eigenvalue of another library with both vectors (seed %i)", (seed) => {
    const pencil = pencilOf(randomCase(seed, 8, 1, 1));
    const wanted = companionEigenvalues(pencil)
      .filter(({ im }) => im > 0)
      .sort((a, b) => a.im - b.im)[2]!;
    const factor = pencil.factor(wanted.re + 1e-3, wanted.im + 1e-3);
    const pair = refineEigenpair(
      pencil,
      wanted.re + 1e-3,
      wanted.im + 1e-3,
      randomVector(8, seed),
      randomVector(8, seed + 9),
      factor,
    );
    expect(pair.converged).toBe(true);
    // Condition of the eigenvalue times eps.
    expect(Math.hypot(pair.re - wanted.re, pair.im - wanted.im)).toBeLessThan(1e-11);
    const norm = pencilNorm(pencil, pair.re, pair.im);
    expect(norm2(applyPencil(pencil, pair.re, pair.im, pair.right)) / norm).toBeLessThan(1e-12);
    expect(norm2(applyPencilAdjoint(pencil, pair.re, pair.im, pair.left)) / norm).toBeLessThan(1e-9);
  });

  it("finds the rigid motion of a free body", () => {
    const pencil = pencilOf({ mass: [[1]], stiffness: [[0]] });
    const one = { re: Float64Array.of(1), im: Float64Array.of(0) };
    const pair = refineEigenpair(pencil, 0, 0, one, one, pencil.factor(1e-4, 0));
    expect(pair.converged).toBe(true);
    expect(Math.hypot(pair.re, pair.im)).toBeLessThan(1e-7);
  });
});

describe("Arnoldi on the full model", () => {
  // Frequencies 0.5, 0.7, … apart like those of a structure.
  const structureLike = (seed: number) => ({
    ...randomCase(seed, 40, 1, 1, 0.02),
    mass: diagonal(new Array(40).fill(1)),
    damping: definite(createRandom(seed), 40, 0.01),
    stiffness: diagonal(Array.from({ length: 40 }, (_, i) => (0.5 + 0.2 * i) ** 2)),
  });

  it.each([
    [1, 0.02, 1.5],
    [2, -0.5, 2.5],
    [3, 0, 0.2],
  ])("finds all eigenvalues in its disc, as another library does (seed %i)", (seed, sRe, sIm) => {
    const given = structureLike(seed);
    const { model, state } = modelOf(given);
    const pencil = new FullModel(model).pencilAt(state);
    const area = nearbyEigenvalues(pencil, pencil.factor(sRe, sIm), 2, 1);
    const all = companionEigenvalues(pencilOf(given)).filter(
      ({ re, im }) => Math.hypot(re - sRe, im - sIm) < area.radius,
    );
    expect(area.radius).toBeGreaterThan(0);
    expect(all.length).toBeGreaterThan(3);
    for (const { re, im } of all) {
      const nearest = Math.min(...area.eigenvalues.map((own) => Math.hypot(own.re - re, own.im - im)));
      // Residual 1e-9 at most; conditions of random eigenvalues are tens.
      expect(nearest).toBeLessThan(1e-7);
    }
  });

  it("goes on until its disc reaches as far as asked for, or the steps are spent", () => {
    const given = structureLike(5);
    const { model, state } = modelOf(given);
    const pencil = new FullModel(model).pencilAt(state);
    const disc = (effort: DiscEffort) => nearbyEigenvalues(pencil, pencil.factor(0, 2.5), 2, 1, effort);
    const far = disc({ steps: 16, reach: 1.2, mostSteps: 60 });
    expect(far.radius).toBeGreaterThanOrEqual(1.2);
    const all = companionEigenvalues(pencilOf(given)).filter(
      ({ re, im }) => Math.hypot(re, im - 2.5) < far.radius,
    );
    expect(far.eigenvalues.length).toBeGreaterThanOrEqual(all.length);
    for (const { re, im } of all) {
      const nearest = Math.min(...far.eigenvalues.map((own) => Math.hypot(own.re - re, own.im - im)));
      expect(nearest).toBeLessThan(1e-7);
    }
    const spent = disc({ steps: 16, reach: 1.2, mostSteps: 24 });
    expect(spent.radius).toBeLessThan(far.radius);
    expect(disc({ steps: 24, reach: 0, mostSteps: 24 })).toEqual(spent);
  });

  it("knows the whole spectrum of one dof, massless too", () => {
    for (const given of [
      { mass: [[2]], damping: [[1]], stiffness: [[8]] },
      { mass: [[0]], damping: [[1]], stiffness: [[8]] },
    ]) {
      const pencil = pencilOf(given);
      const area = nearbyEigenvalues(pencil, pencil.factor(0, 1), 2, 1);
      expect(area.radius).toBe(inf);
      expect(area.eigenvalues).toHaveLength(given.mass[0]![0] === 0 ? 1 : 2);
    }
  });
});

describe("a crossing", () => {
  // Equal modes with cross-coupling α: s² + ds + k ± iα = 0 crosses at α = d√k.
  const whirl = (d: number, k: number): Case => ({
    mass: diagonal([1, 1]),
    damping: diagonal([d, d]),
    stiffness: diagonal([k, k]),
    circulatory: [
      [0, 1],
      [-1, 0],
    ],
  });
  const along = (given: Case) => (alpha: number) =>
    pencilOf({ ...given, circulatory: given.circulatory!.map((row) => row.map((value) => alpha * value)) });

  it("is polished from a rough guess to its closed form", () => {
    const pencilAt = along(whirl(0.1, 4));
    // The forward whirl (1, −i), roughly.
    const whirling = { re: Float64Array.of(1, 0.2), im: Float64Array.of(0.1, -0.8) };
    const found = refineCrossing(pencilAt, 0.23, 1.95, whirling, whirling);
    expect(found.converged).toBe(true);
    expect(found.alpha).toBeCloseTo(0.2, 13);
    expect(found.omega).toBeCloseTo(2, 13);
    // dλ/dα = ±i/(2s + d): real part 2ω/((2ω)² + d²).
    expect(found.drift).toBeCloseTo(4 / (16 + 0.01), 10);
  });

  it("of divergence keeps ω = 0", () => {
    const pencilAt = along({ mass: [[1]], damping: [[0.3]], stiffness: [[5]], circulatory: [[-2]] });
    const found = refineCrossing(pencilAt, 2.2, 0, randomVector(1, 1), randomVector(1, 2));
    expect(found.alpha).toBeCloseTo(2.5, 13);
    expect(found.omega).toBe(0);
  });

  const critical = (given: Case, band = settingFor(0, inf, 2)) =>
    multiplier.estimate((alpha) => along(given)(alpha), band);

  it("is found along the path from nothing", () => {
    expect(critical(whirl(0.1, 4)).value).toBeCloseTo(0.2, 10);
    expect(
      critical({ mass: [[1]], damping: [[0.3]], stiffness: [[5]], circulatory: [[-2]] }).value,
    ).toBeCloseTo(2.5, 10);
  });

  it("is the first one: an unstable window below a later crossing is not stepped over", () => {
    // F − terms: dof pairs whose growth is −c + 2α − α² (positive between α₁ and α₂ only) need N of rank two:
    // K + αN with eigenvalues that leave and re-enter. Equal damping: unstable where Im λ exceeds d√Re λ.
    // λ = 4 ± √(q(α)), q = (α − 1)(α − 1.2)·a: complex, hence flutter, only within (1, 1.2).
    const window: Case = {
      mass: diagonal([1, 1, 1, 1]),
      damping: diagonal([0.002, 0.002, 0.1, 0.1]),
      stiffness: [
        [4, -1, 0, 0],
        [-1.2, 4, 0, 0],
        [0, 0, 9, 0],
        [0, 0, 0, 9],
      ],
      circulatory: [
        [0, 1, 0, 0],
        [1, 0, 0, 0],
        [0, 0, 0, 0.1],
        [0, 0, -0.1, 0],
      ],
    };
    // (α − 1)(α − 1.2) = −δ² with Im √ = d·√4 at the border: δ = 2·0.002.
    const border = 1.1 - Math.sqrt(0.01 - 16e-6);
    expect(critical(window).value).toBeCloseTo(border, 8);
    // Without the first pair the second crosses at 0.1·3/0.1.
    const later = { ...window, damping: diagonal([1, 1, 0.1, 0.1]) };
    expect(critical(later).value).toBeCloseTo(3, 8);
  });

  it("does not exist where nothing feeds, and is 0 where the model is unstable without feeding", () => {
    expect(critical({ ...whirl(0.1, 4), circulatory: diagonal([0, 0]) }).value).toBe(inf);
    expect(critical({ mass: [[1]], damping: [[0.1]], stiffness: [[-1]], circulatory: [[0.1]] }).value).toBe(
      0,
    );
  });
});

describe("decay", () => {
  it("comes as rate, ratio and logarithmic decrement", () => {
    expect(decayOf("rate", -0.3, 4)).toBe(0.3);
    expect(decayOf("ratio", -3, 4)).toBeCloseTo(0.6, 15);
    // δ = 2πζ/√(1 − ζ²) = 2π·3/4.
    expect(decayOf("logDecrement", -3, 4)).toBeCloseTo(1.5 * Math.PI, 14);
    expect(decayOf("logDecrement", -3, 0)).toBe(inf);
    expect(decayOf("logDecrement", 3, 0)).toBe(-inf);
  });

  it("of the least damped eigenvalue in the band, which the chosen kind picks", () => {
    const pencil = pencilOf({
      mass: diagonal([1, 1, 1]),
      damping: diagonal([0.02, 0.05, 0.001]),
      stiffness: diagonal([1, 100, 1e4]),
    });
    const within = settingFor(0.5, 20, 10);
    expect(decay("rate").estimate(() => pencil, within).value).toBeCloseTo(0.01, 10);
    expect(decay("ratio").estimate(() => pencil, within).value).toBeCloseTo(0.0025, 10);
    expect(decay("rate").estimate(() => pencil, settingFor(30, 40, 10)).value).toBe(inf);
  });
});

describe("the verdict on stability", () => {
  const setting = settingFor(1, 10, 10);

  it("counts pairs twice, real ones once, the band's inside and outside apart", () => {
    const list = [
      { re: 0.1, im: 2 },
      { re: 0.2, im: 11 },
      { re: 0.3, im: 0 },
      { re: -0.1, im: 3 },
      { re: 0, im: 4 },
    ];
    const verdict = verdictOf(list, [], setting, 0, 0);
    expect(verdict).toMatchObject({ unstable: 2, unstableOutside: 3, onAxis: 1, abscissa: 0.1 });
    expect(verdict.leastDamped[0]).toEqual({ re: 0.1, im: 2 });
    expect(verdictOf([], [], setting, 0, 0).abscissa).toBe(-inf);
  });

  it("takes rounding for rounding", () => {
    expect(isUnstable(1e-12, 5, 10)).toBe(false);
    expect(isUnstable(1e-8, 5, 10)).toBe(true);
    expect(isUnstable(1e-7, 0, 10)).toBe(false);
    expect(inBand(bandOf(null), 1e9)).toBe(true);
    expect(inBand(bandOf([1, 2]), -2 * Math.PI * 1.5)).toBe(true);
  });
});

describe("witness and power balance", () => {
  const cases: [string, Case][] = [
    ["stiffness-like", { ...randomCase(4, 6, 2, 3, 0.02), acts: "stiffness" }],
    [
      "damping-like",
      { ...randomCase(5, 6, 3, 2, 0.02), acts: "damping", frictional: diagonal([-0.01, 0, 0, 0, 0, 0]) },
    ],
    ["unstable", { ...randomCase(6, 6, 1, 1, 0), frictional: diagonal([-0.5, 0, 0, 0, 0, 0]) }],
    ["without gyroscopic terms", { mass: [[2]], damping: [[0.1]], stiffness: [[3]] }],
  ];

  it.each(cases)("close on the full model: %s", (_, given) => {
    const { model, state } = modelOf(given);
    const full = new FullModel(model);
    const dense: DensePencil = pencilOf(given);
    const setting = settingFor(0, inf, 2);
    const { criticals } = radius.estimate(() => dense, setting);
    const pencil = full.pencilAt(state);
    const checked = radius.check(() => pencil, criticals[0]!, identity, setting);
    expect(Math.abs(checked.value - criticals[0]!.value)).toBeLessThan(1e-9);
    const witness = witnessOf(pencil, checked);
    expect(witness.residual).toBeLessThan(1e-13);
    if (checked.value > 0) expect(witness.size).toBeCloseTo(checked.value, 12);
    const balance = powerBalance(model, state, pencil, checked);
    expect(balance.gap).toBeLessThan(1e-8);
    expect(balance.rows.some(({ power }) => power > 0)).toBe(true);
    expect(balance.rows.some(({ power }) => power < 0)).toBe(true);
  });
});
