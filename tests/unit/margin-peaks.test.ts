import { describe, expect, it } from "vitest";
import { channelGain } from "../../src/margin/channel-gain.js";
import { levelCrossings } from "../../src/margin/level-set.js";
import { missedPeaks } from "../../src/margin/missed-peaks.js";
import { findPeaks, gainFunction, peakDefaults } from "../../src/margin/peaks.js";
import { polishPeak } from "../../src/margin/polish-peak.js";
import { spectralForm } from "../../src/margin/spectral-form.js";
import { transferInto } from "../../src/margin/transfer.js";
import { complexZeros } from "../../src/numerics/dense/matrix.js";
import { largestSingularValue } from "../../src/numerics/dense/svd.js";
import { applyComplexTransposed } from "../../src/numerics/real-operator.js";
import {
  type Case,
  constant,
  diagonal,
  pencilOf,
  randomCase,
  settingFor,
  slowGain,
  slowMaximum,
} from "./model-cases.js";

const everywhere = { low: 0, high: Number.POSITIVE_INFINITY };

describe("the pole–residue form", () => {
  it.each([
    ["stiffness", 1],
    ["damping", 2],
    ["stiffness", 3],
    ["damping", 4],
  ] as const)("gives the gain of a direct solve (%s-like, seed %i)", (acts, seed) => {
    const pencil = pencilOf({ ...randomCase(seed, 7, 3, 2), acts });
    const gain = gainFunction(spectralForm(pencil, 2));
    for (const omega of [0, 0.3, 1.1, 2, 2.9, 7, 60]) {
      const direct = channelGain(pencil, pencil.factor(0, omega)).sigma;
      // Eigenvectors of a random model are well conditioned: a few hundred eps.
      expect(Math.abs(gain(omega) - direct)).toBeLessThan(1e-11 * direct + 1e-15);
      expect(Math.abs(slowGain(pencil, omega) - direct)).toBeLessThan(1e-11 * direct + 1e-15);
    }
  });

  it("takes a singular mass: the massless dof is a constant term", () => {
    const given: Case = {
      mass: diagonal([1, 0]),
      damping: [
        [0.1, 0],
        [0, 0],
      ],
      stiffness: [
        [3, -1],
        [-1, 2],
      ],
    };
    const pencil = pencilOf(given);
    const gain = gainFunction(spectralForm(pencil, 1));
    for (const omega of [0, 1, 1.6, 50]) expect(gain(omega)).toBeCloseTo(slowGain(pencil, omega), 11);
    // Far up only the massless dof answers: 1/2.
    expect(gain(1e7)).toBeCloseTo(0.5, 9);
  });

  it("takes a model without any mass", () => {
    const pencil = pencilOf({
      mass: diagonal([0, 0]),
      damping: diagonal([1, 2]),
      stiffness: diagonal([3, 4]),
    });
    const gain = gainFunction(spectralForm(pencil, 1));
    for (const omega of [0, 1, 2, 30]) expect(gain(omega)).toBeCloseTo(slowGain(pencil, omega), 12);
  });

  it("takes one dof and channels that see nothing", () => {
    const pencil = pencilOf({
      mass: [[1]],
      damping: [[0.2]],
      stiffness: [[4]],
      left: [[0, 0]],
      right: [[1]],
    });
    expect(gainFunction(spectralForm(pencil, 2))(2)).toBe(0);
    expect(findPeaks(spectralForm(pencil, 2), everywhere)[0]?.sigma ?? 0).toBe(0);
  });

  it("has no peaks without channels", () => {
    const pencil = pencilOf({ mass: [[1]], stiffness: [[4]], left: [[]], right: [] });
    expect(findPeaks(spectralForm(pencil, 2), everywhere)).toEqual([]);
  });

  it("is silent about an undamped mode that B and C do not see", () => {
    const pencil = pencilOf({
      mass: diagonal([1, 1]),
      damping: diagonal([0.2, 0]),
      stiffness: diagonal([1, 4]),
      left: [[1], [0]],
      right: [[1, 0]],
    });
    const form = spectralForm(pencil, 1);
    const h = complexZeros(1, 1);
    transferInto(h, form, 2);
    expect(largestSingularValue(h)).toBeCloseTo(1 / Math.hypot(3, 0.4), 12);
  });

  it("takes three equal modes, whose vectors are any bases of their spaces", () => {
    const equal = (value: number) => diagonal([value, value, value]);
    const pencil = pencilOf({ mass: equal(1), damping: equal(0.1), stiffness: equal(1) });
    const form = spectralForm(pencil, 1.3);
    expect(form.direct).toBe(null);
    // 1/|1 − ω² + 0.1iω|.
    for (const omega of [0, 0.9, 1, 1.4])
      expect(gainFunction(form)(omega)).toBeCloseTo(1 / Math.hypot(1 - omega ** 2, 0.1 * omega), 11);
  });

  it("survives a critically damped mode, whose two poles are one defective eigenvalue", () => {
    const pencil = pencilOf({ mass: [[1]], damping: [[2]], stiffness: [[1]] });
    const gain = gainFunction(spectralForm(pencil, 1));
    // H = 1/(1 + iω)². The sum over poles fails, so the pencil is solved at each frequency: full accuracy.
    for (const omega of [0, 0.5, 1, 3]) expect(gain(omega)).toBeCloseTo(1 / (1 + omega * omega), 14);
  });
});

describe("the search for peaks", () => {
  it("finds the highest peak of random models that a dense scan finds", () => {
    for (let seed = 1; seed <= 12; seed++) {
      const acts = seed % 2 === 0 ? "damping" : "stiffness";
      const pencil = pencilOf({ ...randomCase(seed, 6, 2, 2), acts });
      const form = spectralForm(pencil, 2);
      const [peak] = findPeaks(form, { low: 0, high: 12 });
      const slow = slowMaximum(gainFunction(form), 0, 12);
      // The scan's own ternary search flattens at √eps in ω, eps in the height.
      expect(peak!.sigma).toBeGreaterThan(slow.value * (1 - 1e-12));
      expect(peak!.sigma).toBeLessThan(slow.value * (1 + 1e-9));
      expect(Math.abs(peak!.omega - slow.at)).toBeLessThan(1e-5 * slow.at + 1e-7);
    }
  });

  it("finds a peak at ω = 0 and reports it there exactly", () => {
    // c² > 2mk: the compliance falls from ω = 0 on.
    const pencil = pencilOf({ mass: [[1]], damping: [[3]], stiffness: [[2]] });
    const [peak, ...others] = findPeaks(spectralForm(pencil, 1), everywhere);
    expect(peak!.omega).toBe(0);
    expect(peak!.sigma).toBeCloseTo(0.5, 12);
    expect(others).toEqual([]);
  });

  it("finds the peak of an overdamped mode seen by damping errors, far from any Im λ", () => {
    // |iω/(k − ω² + icω)| is 1/c at ω = √(k/m), whatever the damping; poles are real. A second, stiff dof sets another scale.
    const pencil = pencilOf({
      mass: diagonal([1, 1]),
      damping: diagonal([20, 900]),
      stiffness: diagonal([1, 1e6]),
      acts: "damping",
    });
    const [peak] = findPeaks(spectralForm(pencil, 1), everywhere);
    expect(peak!.sigma).toBeCloseTo(1 / 20, 10);
    expect(peak!.omega).toBeCloseTo(1, 4);
  });

  it("finds the plateau that damping errors on massless dofs reach at infinite frequency", () => {
    // iω/(iωc + k) grows towards 1/c and never gets there.
    const pencil = pencilOf({
      mass: diagonal([1, 0]),
      damping: diagonal([4, 0.5]),
      stiffness: diagonal([1, 1]),
      acts: "damping",
    });
    const [peak] = findPeaks(spectralForm(pencil, 1), everywhere);
    expect(peak!.sigma).toBeCloseTo(2, 8);
  });

  it("keeps a low stiffness-like peak in sight when high modes answer damping errors", () => {
    // Compliances 50 at ω = 1 and 1 at ω = 1000; a weak damping error sits on the second mode.
    const plain = pencilOf({
      mass: diagonal([1, 1]),
      damping: diagonal([0.02, 0.001]),
      stiffness: diagonal([1, 1e6]),
      left: [
        [1, 0, 0],
        [0, 1, 1e-3],
      ],
    });
    const pencil = { ...plain, powers: Uint8Array.of(0, 0, 1) };
    const [peak] = findPeaks(spectralForm(pencil, 1000), { low: 0, high: 3000 });
    expect(peak!.omega).toBeCloseTo(1, 3);
    expect(peak!.sigma).toBeCloseTo(50, 1);
  });

  it("takes the band's end where the gain still rises there", () => {
    const pencil = pencilOf({ mass: [[1]], damping: [[0.1]], stiffness: [[1]] });
    const form = spectralForm(pencil, 1);
    expect(findPeaks(form, { low: 0.2, high: 0.7 })[0]!.omega).toBeCloseTo(0.7, 8);
    expect(findPeaks(form, { low: 1.5, high: 4 })[0]!.omega).toBeCloseTo(1.5, 8);
  });

  it("reports every competitor above the share asked for, highest first", () => {
    const pencil = pencilOf({
      mass: diagonal([1, 1, 1]),
      damping: diagonal([0.1, 0.05, 0.05]),
      stiffness: diagonal([1, 4, 25]),
    });
    // Peaks 1/(cω): 10, 10, 4.
    const form = spectralForm(pencil, 2);
    const found = findPeaks(form, everywhere, { ...peakDefaults, keep: 0.3 });
    expect(found.map((peak) => Math.round(peak.omega))).toEqual(expect.arrayContaining([1, 2, 5]));
    expect(findPeaks(form, everywhere, { ...peakDefaults, keep: 0.7 })).toHaveLength(2);
  });
});

describe("the local polish", () => {
  it("finds the vertex of a parabola to its accuracy", () => {
    const peak = polishPeak((x) => 3 - (x - 2) ** 2, 0, 1, 5, 2);
    // Heights are equal to eps within √eps of the vertex.
    expect(peak.omega).toBeCloseTo(2, 7);
    expect(peak.sigma).toBeCloseTo(3, 14);
  });

  it("never ends below its start", () => {
    const comb = (x: number) => Math.sin(40 * x);
    for (const start of [0.3, 0.9, 1.7]) {
      expect(polishPeak(comb, 0, start, 2, comb(start)).sigma).toBeGreaterThanOrEqual(comb(start));
    }
  });
});

describe("the level-set test", () => {
  it.each([1, 2, 3, 4, 5, 6])("crosses the level where a scan does (seed %i)", (seed) => {
    const acts = seed % 2 === 0 ? "damping" : "stiffness";
    const pencil = pencilOf({ ...randomCase(20 + seed, 5, 1, 1), acts });
    const gain = gainFunction(spectralForm(pencil, 2));
    const band = { low: 0.05, high: 10 };
    const level = 0.35 * slowMaximum(gain, band.low, band.high).value;
    const crossings = levelCrossings(pencil, level, 2, band);
    const scanned: number[] = [];
    for (let k = 0; k < 20000; k++) {
      const [a, b] = [0, 1].map((end) => band.low + ((k + end) * (band.high - band.low)) / 20000);
      if (gain(a!) > level !== gain(b!) > level) scanned.push(0.5 * (a! + b!));
    }
    expect(crossings).toHaveLength(scanned.length);
    // Half a step of the scan.
    crossings.forEach((omega, k) => {
      expect(Math.abs(omega - scanned[k]!)).toBeLessThan(3e-4);
      expect(gain(omega)).toBeCloseTo(level, 8);
    });
  });

  it("is empty above the highest peak, and takes a singular mass", () => {
    const given = { mass: diagonal([1, 0]), damping: diagonal([0.1, 0.3]), stiffness: diagonal([1, 2]) };
    const pencil = pencilOf(given);
    const top = 1 / (0.1 * Math.sqrt(1 - 0.0025));
    expect(levelCrossings(pencil, 1.001 * top, 1, everywhere)).toEqual([]);
    expect(levelCrossings(pencil, 0.999 * top, 1, everywhere)).toHaveLength(2);
  });

  it("finds a narrow peak that the search was not told of", () => {
    const pencil = pencilOf({
      mass: diagonal([1, 1]),
      damping: diagonal([0.3, 1e-4]),
      stiffness: diagonal([1, 9]),
      left: [[1], [0.03]],
      right: [[1, 0.03]],
    });
    const setting = settingFor(0, 10, 1);
    // σ = 1/(0.3·1) at ω = 1; the other peak is 9e-4/(3e-4) = 3, below it; against 2.5 it shows.
    const [missed] = missedPeaks(pencil, setting, 2.5).filter((omega) => omega > 2);
    expect(missed).toBeCloseTo(3, 4);
    expect(missedPeaks(pencil, setting, 3.4)).toEqual([]);
  });
});

describe("wide channels", () => {
  const wide = (inputs: number, outputs: number, seed: number) => randomCase(seed, 9, inputs, outputs);

  it.each([
    [72, 72],
    [72, 1],
    [25, 2],
    [72, 3],
    [30, 40],
  ])("searched by directions give the largest gain of all %i × %i", (inputs, outputs) => {
    const pencil = pencilOf(wide(inputs, outputs, inputs + outputs));
    for (const omega of [0, 1.3, 2.4]) {
      const gain = channelGain(pencil, pencil.factor(0, omega));
      expect(gain.sigma).toBeCloseTo(slowGain(pencil, omega), 9);
    }
  });

  it("find a direction on which a plain start vector has no part", () => {
    // H = diag(1, …) on sums and on differences: the strongest input is antisymmetric.
    const half = 13;
    const n = 2;
    const left = [
      Array.from({ length: 2 * half }, (_, k) => (k < half ? 1 : -1)),
      new Array<number>(2 * half).fill(0.1),
    ];
    const right = constant(0, n, 0).concat([
      [1, 0],
      [0, 1],
    ]);
    const pencil = pencilOf({
      mass: diagonal([1, 1]),
      damping: diagonal([1, 1]),
      stiffness: diagonal([1, 1]),
      left,
      right,
    });
    expect(channelGain(pencil, pencil.factor(0, 0)).sigma).toBeCloseTo(Math.sqrt(26), 10);
  });

  it("have no gain where nothing is seen", () => {
    const pencil = pencilOf({ mass: [[1]], damping: [[1]], stiffness: [[1]], left: constant(1, 30, 0) });
    expect(channelGain(pencil, pencil.factor(0, 0.5)).sigma).toBe(0);
  });

  it("bring the response and the adjoint response that belong to the gain", () => {
    const pencil = pencilOf(wide(40, 30, 5));
    const { sigma, u, v, x, y } = channelGain(pencil, pencil.factor(0, 1.1));
    const outputs = applyComplexTransposed(pencil.outputTransposed, x).re;
    // Re(C x) = σ Re u.
    outputs.forEach((value, i) => {
      expect(value).toBeCloseTo(sigma * u.re[i]!, 9);
    });
    const inputs = applyComplexTransposed(pencil.input, y).re;
    inputs.forEach((value, k) => {
      expect(value).toBeCloseTo(sigma * v.re[k]!, 6);
    });
  });
});
