import { describe, expect, it } from "vitest";
import { followPeaks } from "../../src/margin/follow-peaks.js";
import { findPeaks, peakDefaults } from "../../src/margin/peaks.js";
import { spectralForm } from "../../src/margin/spectral-form.js";
import { type Case, diagonal, pencilOf, type Rows, randomCase } from "./model-cases.js";

const everywhere = { low: 0, high: Number.POSITIVE_INFINITY };

const scaled = (rows: Rows, factor: number): Rows => rows.map((row) => row.map((value) => factor * value));

/** A design a little aside: stiffer, lighter, better damped. */
function aside(given: Case): Case {
  return {
    ...given,
    mass: scaled(given.mass!, 0.99),
    damping: scaled(given.damping!, 1.04),
    stiffness: scaled(given.stiffness!, 1.01),
  };
}

/** Two modes at 1 and 2 rad/s, lightly damped, the second by `damping`. */
const twoModes = (damping: number, second = 4): Case => ({
  mass: diagonal([1, 1]),
  damping: diagonal([0.02, damping]),
  stiffness: diagonal([1, second]),
});

describe("peaks followed from a similar model", () => {
  it.each([
    ["stiffness", 1],
    ["damping", 2],
    ["stiffness", 3],
    ["damping", 4],
    ["stiffness", 5],
    ["damping", 6],
  ] as const)("are those that a search finds (%s-like, seed %i)", (acts, seed) => {
    const base = randomCase(seed, 6, 3, 2);
    // A third of the damping: peaks that stand apart, and move by a few half widths.
    const given: Case = { ...base, damping: scaled(base.damping!, 0.33), acts };
    const known = findPeaks(spectralForm(pencilOf(given), 2), everywhere).filter(({ omega }) => omega > 0.1);
    const there = pencilOf(aside(given));
    const searched = findPeaks(spectralForm(there, 2), everywhere, { ...peakDefaults, keep: 0.2 });
    const followed = followPeaks(
      there,
      known.map(({ omega }) => omega),
      everywhere,
      1e-6,
    );
    expect(followed).toHaveLength(known.length);
    expect(followed!.length).toBeGreaterThan(0);
    for (const { omega, sigma } of followed!) {
      const same = searched.find((peak) => Math.abs(peak.omega - omega) < 1e-3 * omega);
      expect(Math.abs(sigma / same!.sigma - 1)).toBeLessThan(1e-6);
    }
  });

  it("come in the order asked for", () => {
    const followed = followPeaks(pencilOf(twoModes(0.02)), [1.99, 1.01], everywhere, 1e-6);
    expect(followed!.map(({ omega }) => Math.round(omega))).toEqual([2, 1]);
    // 1/(c ω √(1 − ζ²)).
    expect(followed![1]!.sigma).toBeCloseTo(50, 2);
    expect(followPeaks(pencilOf(twoModes(0.02)), [], everywhere, 1e-6)).toEqual([]);
  });

  it("are none when the mode behind one has become unstable or lost all damping", () => {
    expect(followPeaks(pencilOf(twoModes(-0.01)), [1, 1.99], everywhere, 1e-6)).toBe(null);
    expect(followPeaks(pencilOf(twoModes(0)), [1, 1.99], everywhere, 1e-6)).toBe(null);
    // The other mode knows nothing of it: what is not followed is not seen.
    expect(followPeaks(pencilOf(twoModes(-0.01)), [1], everywhere, 1e-6)).toHaveLength(1);
  });

  it("are none when one leaves the band", () => {
    const band = { low: 0.5, high: 2.1 };
    expect(followPeaks(pencilOf(twoModes(0.02, 4.3)), [2.05], band, 1e-6)).toHaveLength(1);
    expect(followPeaks(pencilOf(twoModes(0.02, 4.5)), [2.05], band, 1e-6)).toBe(null);
  });

  it("are none when two have run into one", () => {
    expect(followPeaks(pencilOf(twoModes(0.02)), [1.001, 0.999], everywhere, 1e-6)).toBe(null);
  });

  it("are none where the gain is highest at rest or has no peak", () => {
    const overdamped = pencilOf({ mass: [[1]], damping: [[3]], stiffness: [[1]] });
    expect(followPeaks(overdamped, [0], everywhere, 1e-6)).toBe(null);
    expect(followPeaks(overdamped, [0.3], everywhere, 1e-6)).toBe(null);
  });
});
