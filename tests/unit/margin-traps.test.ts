/**
 * The traps of CHECK-VALUES.md §6, each walked into on purpose. Every test was seen red with the line taken out
 * that its comment names.
 */

import { describe, expect, it } from "vitest";
import { FullModel } from "../../src/fullorder/full-model.js";
import { channelGain } from "../../src/margin/channel-gain.js";
import { decay } from "../../src/margin/decay.js";
import { judgeStability } from "../../src/margin/full-stability.js";
import { fullCrewOf } from "../../src/margin/full-tasks.js";
import type { Measure, Setting } from "../../src/margin/measure.js";
import { missedPeaks } from "../../src/margin/missed-peaks.js";
import { multiplier } from "../../src/margin/multiplier.js";
import { peakDefaults } from "../../src/margin/peaks.js";
import { marginAt, type PointMargin, settingOf, statesAt } from "../../src/margin/point-margin.js";
import { radius } from "../../src/margin/radius.js";
import { settle, settleDefaults } from "../../src/margin/settle.js";
import { buildModel, stateAt } from "../../src/model/parametric-model.js";
import type { Problem } from "../../src/problem/problem.js";
import { AdaptiveModel } from "../../src/reduction/adaptive-model.js";
import { type Case, diagonal, formula, pencilOf, problemOf, slowMaximum, tripletsOf } from "./model-cases.js";

/** More than 60 dofs with a band: the reduced model is a true projection. */
const n = 80;

interface Posed {
  readonly problem: Problem;
  readonly adaptive: AdaptiveModel;
  readonly setting: Setting;
}

function pose(given: Case, bandHz: readonly [number, number], more: Partial<Problem> = {}): Posed {
  const base = problemOf(given, more);
  const problem = { ...base, margin: { ...base.margin, bandHz } };
  const model = buildModel(problem);
  const start = stateAt(model, problem.constants);
  const adaptive = new AdaptiveModel(new FullModel(model), start, 2 * Math.PI * bandHz[1]);
  return { problem, adaptive, setting: settingOf(problem.margin, adaptive) };
}

const ask = ({ problem, adaptive, setting }: Posed, measure: Measure): Promise<PointMargin> =>
  marginAt(adaptive, measure, problem.constants, setting);

/** Unit masses on springs of their own, ω_i as given, damped with the ratio ζ. */
function oscillators(
  omega: readonly number[],
  zeta: number,
): Required<Pick<Case, "mass" | "damping" | "stiffness">> {
  return {
    mass: diagonal(omega.map(() => 1)),
    damping: diagonal(omega.map((w) => 2 * zeta * w)),
    stiffness: diagonal(omega.map((w) => w * w)),
  };
}

/** A matrix of zeros but for some entries [row, column, value]. */
function entries(...list: readonly (readonly [number, number, number])[]): number[][] {
  const out = Array.from({ length: n }, () => new Array<number>(n).fill(0));
  for (const [i, j, value] of list) out[i]![j] = value;
  return out;
}

const unitColumn = (at: number) => Array.from({ length: n }, (_, i) => [i === at ? 1 : 0]);
const unitRow = (at: number) => [Array.from({ length: n }, (_, j) => (j === at ? 1 : 0))];
const hz = (omega: number) => omega / (2 * Math.PI);

/** Frequencies 1 … n/10 rad/s: the first ten lie in a band up to 1. */
const ladder = Array.from({ length: n }, (_, i) => 0.1 * (i + 1) + 0.001 * i * i);
const band: readonly [number, number] = [hz(0.05), hz(1.15)];

describe("trap 1: a one-sided projection and stability", () => {
  it("a reduced model that is unstable though the full one is stable is refuted", async () => {
    // Dof 0 is fed by dof 79 (ω ≈ 14, outside every basis), which is held down by dof 0: N couples them so that the
    // statically condensed stiffness is positive, but that of dof 0 alone, k₀ + N₀₀ = 0.01 − 0.05, is negative.
    const far = n - 1;
    const given = {
      ...oscillators(ladder, 0.01),
      circulatory: entries([0, 0, -0.05], [0, far, 1], [far, 0, -0.1 * ladder[far]! ** 2]),
      left: unitColumn(1),
      right: unitRow(1),
    };
    const posed = pose(given, [0, band[1]]);
    const [before] = radius.estimate(
      () => posed.adaptive.reducedAt(statesAt(posed.adaptive.full.model, posed.problem.constants)(1)),
      posed.setting,
    ).criticals;
    expect(before!.kind).toBe("eigenvalue");
    const point = await ask(posed, radius);
    // Guard: `checkEigenvalue` in radius.ts looks at the full model before it believes.
    expect(point.value).toBeGreaterThan(0);
    expect(point.stability.unstable).toBe(0);
    expect(point.doubts).toEqual([]);
  });

  it("the same holds at the loose tolerance of a search, where a small gap must not pass for agreement", () => {
    // Negative damping takes 0.1 % more than dof 4 has; what dof 79 sends back, 90° late, gives 0.2 % again.
    const far = n - 1;
    const own = 0.02 * ladder[4]!;
    const given = {
      ...oscillators(ladder, 0.01),
      frictional: entries([4, 4, -1.001 * own], [far, 4, -0.002 * own * ladder[far]! ** 2]),
      circulatory: entries([4, far, 1]),
      left: unitColumn(1),
      right: unitRow(1),
    };
    const { adaptive, problem, setting } = pose(given, band);
    const states = statesAt(adaptive.full.model, problem.constants);
    const settled = settle(adaptive, radius, states, setting, { ...settleDefaults, tolerance: 1e-2 });
    expect(settled.records[0]!.reduced).toBeLessThan(0);
    // Guard: `Number.POSITIVE_INFINITY` in radius.ts; with the value of a stable eigenvalue instead, it decides.
    expect(settled.decisive!.found.kind).toBe("peak");
    expect(settled.value).toBeCloseTo(0.02 * ladder[1]! ** 2, 5);
  });

  it("an instability that the basis cannot show is found on the full model and learnt", async () => {
    // Two modes far above the band, pulled down into it by N and made to flutter there; B, C and the basis do not see them.
    const [a, b] = [n - 2, n - 1] as const;
    const given = {
      ...oscillators(ladder, 0.01),
      circulatory: entries(
        [a, a, 0.5 - ladder[a]! ** 2],
        [b, b, 0.5 - ladder[b]! ** 2],
        [a, b, 0.4],
        [b, a, -0.4],
      ),
      damping: diagonal(ladder.map((w, i) => (i >= a ? 0.01 : 0.02 * w))),
      left: unitColumn(1),
      right: unitRow(1),
    };
    const posed = pose(given, band);
    const { adaptive, setting } = posed;
    const state = stateAt(adaptive.full.model, posed.problem.constants);
    const reduced = decay("rate").estimate(() => adaptive.reducedAt(state), setting).eigenvalues;
    expect(Math.max(...reduced.re)).toBeLessThan(0);
    const verdict = await judgeStability(fullCrewOf(adaptive.full), adaptive, state, setting, reduced);
    expect(verdict.missed).toHaveLength(1);
    // Guard: `walkAxis` in axis-walk.ts (no suspect of the reduced model is near), `news` in point-margin.ts.
    const point = await ask(posed, radius);
    expect(point.stability.unstable).toBe(2);
    expect(point.value).toBeLessThan(0);
    // s² + 0.01 s + 0.5 ± 0.4i = 0.
    const growth = Math.sqrt(Math.hypot(0.5, 0.4)) * Math.sin(0.5 * Math.atan2(0.4, 0.5)) - 0.005;
    expect(-point.value * setting.omegaRef).toBeCloseTo(growth, 4);
    expect(point.doubts).toEqual([]);
  });

  it("an instability in the band that B and C do not see makes the value negative", async () => {
    const given = {
      ...oscillators(ladder, 0.01),
      frictional: entries([4, 4, -0.1]),
      left: unitColumn(1),
      right: unitRow(1),
    };
    const point = await ask(pose(given, band), radius);
    // Guard: `unstableCriticals` in radius.ts.
    expect(point.value).toBeLessThan(0);
    expect(point.stability.unstable).toBe(2);
  });
});

describe("trap 2: the ends of the frequency axis", () => {
  it("peaks beyond the band are not chased, those at its ends are seen", async () => {
    const given = { ...oscillators(ladder, 0.02), left: unitColumn(14), right: unitRow(14) };
    const point = await ask(pose(given, band), radius);
    // The only mode that B and C see lies above the band: the gain rises to the band's end.
    // Guard: `ends` in peaks.ts, `startGrid`.
    expect(point.omega).toBeCloseTo(2 * Math.PI * band[1], 6);
    const w = ladder[14]!;
    const end = 2 * Math.PI * band[1];
    expect(point.value).toBeCloseTo(Math.hypot(w * w - end * end, 0.04 * w * end), 8);
  });

  it("ω = 0 is looked at when the band holds it", async () => {
    // Overdamped at dof 0: the compliance falls from ω = 0 on.
    const given = {
      ...oscillators(ladder, 0.02),
      damping: diagonal(ladder.map((w, i) => (i === 0 ? 1 : 0.04 * w))),
      left: unitColumn(0),
      right: unitRow(0),
    };
    const point = await ask(pose(given, [0, band[1]]), radius);
    // Guard: `band.low` among the marks in peaks.ts.
    expect(point.omega).toBe(0);
    expect(point.value).toBeCloseTo(ladder[0]! ** 2, 10);
    expect(point.loss).toBe("divergence");
  });

  it("without a band the gain's limit at infinity counts: damping errors on massless undamped dofs have radius 0", async () => {
    const given: Case = {
      mass: diagonal([1, 0]),
      damping: diagonal([0.1, 0]),
      stiffness: diagonal([1, 4]),
      acts: "damping",
    };
    const problem = problemOf(given);
    const model = buildModel(problem);
    const adaptive = new AdaptiveModel(new FullModel(model), stateAt(model, new Map()), null);
    const point = await marginAt(adaptive, radius, new Map(), settingOf(problem.margin, adaptive));
    // Guard: `growsWithoutBound` in peaks.ts.
    expect(point.value).toBe(0);
    expect(point.doubts).toEqual([]);
  });
});

describe("trap 3: the reduced optimum is no bound", () => {
  it("the value reported is that of a full solve at the frequency reported", async () => {
    const given = {
      ...oscillators(ladder, 0.02),
      circulatory: entries([2, 40, 0.3], [40, 2, -0.2], [3, 50, 0.4], [60, 3, 0.1]),
      left: Array.from({ length: n }, (_, i) => [Math.sin(i + 1), Math.cos(3 * i)]),
      right: [0, 1].map((k) => Array.from({ length: n }, (_, j) => Math.sin(2 * j + k))),
    };
    const posed = pose(given, band);
    const point = await ask(posed, radius);
    const pencil = posed.adaptive.full.pencilAt(stateAt(posed.adaptive.full.model, new Map()));
    const fullAt = (omega: number) => 1 / channelGain(pencil, pencil.factor(0, omega)).sigma;
    expect(point.value).toBeCloseTo(fullAt(point.omega!), 12);
    // Loosely settled, reduced and full differ, and it is the full value that counts.
    // Guard: `1 / gain.sigma` in radius.ts and `conclude` in settle.ts.
    const fresh = pose(given, band);
    const states = statesAt(fresh.adaptive.full.model, new Map());
    const loose = settle(fresh.adaptive, radius, states, fresh.setting, {
      ...settleDefaults,
      tolerance: 1,
      competing: 1,
    });
    expect(loose.records[0]!.reduced).not.toBeCloseTo(loose.records[0]!.full, 9);
    expect(loose.value).toBeCloseTo(fullAt(loose.decisive!.omega), 12);
    const slow = slowMaximum(
      (omega) => channelGain(pencil, pencil.factor(0, omega)).sigma,
      2 * Math.PI * band[0],
      2 * Math.PI * band[1],
      600,
    );
    expect(point.value).toBeCloseTo(1 / slow.value, 8);
    expect(point.witness!.residual).toBeLessThan(1e-14);
    expect(point.between[0]).toBeLessThanOrEqual(point.value);
  });
});

describe("trap 4: the double imaginary eigenvalue at the top of a peak", () => {
  it("does not make the level-set test cry wolf at the optimum, nor sleep just below it", () => {
    const pencil = pencilOf({ mass: [[1]], damping: [[0.1]], stiffness: [[1]] });
    const setting: Setting = {
      band: { low: 0, high: 10 },
      shift: 1,
      omegaRef: 1,
      unit: 1,
      peaks: peakDefaults,
    };
    const top = 1 / (0.1 * Math.sqrt(1 - 0.0025));
    // Guard: the sampling between crossings in missed-peaks.ts, and the wide `nearAxis` in level-set.ts.
    expect(missedPeaks(pencil, setting, top * (1 - 1e-9))).toEqual([]);
    expect(missedPeaks(pencil, setting, top * (1 - 1e-5))).toHaveLength(1);
  });
});

describe("trap 6: dense eigenproblems dominate", () => {
  it("the level-set test runs once at the end, not at each turn of the loop", () => {
    const given = {
      ...oscillators(ladder, 0.02),
      circulatory: entries([2, 40, 0.3], [40, 2, -0.2]),
      left: unitColumn(2),
      right: unitRow(2),
    };
    const { adaptive, problem, setting } = pose(given, band);
    let turns = 0;
    const counted: Measure = {
      ...radius,
      estimate: (pencilAt, here) => {
        turns++;
        return radius.estimate(pencilAt, here);
      },
    };
    const states = statesAt(adaptive.full.model, problem.constants);
    const { records } = settle(adaptive, counted, states, setting);
    // One estimate a check and one that finds nothing new. Guard: the loop in settle.ts.
    expect(turns).toBe(records.length + 1);
    expect(records.length).toBeLessThan(6);
  });
});

describe("trap 7: a missed mode", () => {
  it("shows in the count, and a start basis that is not complete is not trusted", () => {
    // 520 modes in the band, more than a reduced model carries.
    const many = Array.from({ length: 540 }, (_, i) => 1 + 0.001 * i);
    const list = many.map((w, i) => [i, w] as const);
    const diagonalTriplets = (value: (w: number) => number) => ({
      rows: many.length,
      cols: many.length,
      row: Int32Array.from(list, ([i]) => i),
      col: Int32Array.from(list, ([i]) => i),
      value: Float64Array.from(list, ([, w]) => value(w)),
    });
    const base = problemOf({ mass: [[1]], damping: [[1]], stiffness: [[1]], acts: "none" });
    const named = (name: string, value: (w: number) => number) =>
      [name, { name, form: "entries" as const, triplets: diagonalTriplets(value) }] as const;
    const problem: Problem = {
      ...base,
      dofs: many.length,
      matrices: new Map([
        named("mass", () => 1),
        named("damping", (w) => 0.02 * w),
        named("stiffness", (w) => w * w),
      ]),
      margin: { ...base.margin, measure: "decay", as: "ratio", bandHz: [hz(0.5), hz(2)] },
    };
    const model = buildModel(problem);
    const adaptive = new AdaptiveModel(new FullModel(model), stateAt(model, new Map()), 2);
    expect(adaptive.modeCounts[0]!.count).toBe(540);
    // Guard: `wanted === count` in adaptive-model.ts.
    expect(adaptive.modeCounts[0]!.complete).toBe(false);
  });

  it("an incomplete count becomes a doubt", async () => {
    const given = { ...oscillators(ladder, 0.02), left: unitColumn(2), right: unitRow(2) };
    const posed = pose(given, band);
    expect(posed.adaptive.modeCounts.every((modes) => modes.complete)).toBe(true);
    const incomplete = new Proxy(posed.adaptive, {
      get: (target, key) =>
        key === "modeCounts"
          ? [{ upToOmega: 1, count: 10, complete: false }]
          : typeof Reflect.get(target, key, target) === "function"
            ? Reflect.get(target, key, target).bind(target)
            : Reflect.get(target, key, target),
    });
    const point = await marginAt(incomplete, radius, new Map(), posed.setting);
    // Guard: `adaptive.modeCounts.some` in point-margin.ts.
    expect(point.doubts).toHaveLength(1);
    expect((await ask(posed, radius)).doubts).toEqual([]);
  });
});

describe("trap 8: undamped coalescence", () => {
  it("is told from the onset with damping: modes on the axis are counted", async () => {
    const given: Case = {
      mass: diagonal([1, 1]),
      stiffness: [
        [3, 1],
        [1, 7 / 3],
      ],
      circulatory: [
        [0, -4 / 3],
        [0, 0],
      ],
      acts: "none",
    };
    const at = (damping: number) => {
      const problem = problemOf({ ...given, damping: diagonal([damping, damping / 5]) });
      const model = buildModel({ ...problem, margin: { ...problem.margin, measure: "multiplier" } });
      const adaptive = new AdaptiveModel(new FullModel(model), stateAt(model, new Map()), null);
      return marginAt(adaptive, multiplier, new Map(), settingOf(problem.margin, adaptive));
    };
    const undamped = await at(0);
    const damped = await at(1e-4);
    // 5/6 without damping. With vanishing damping in the ratio 5:1 the onset is far lower: one is not the limit of the other.
    expect(undamped.value).toBeCloseTo(5 / 6, 5);
    expect(damped.value).toBeLessThan(0.8);
    const below = {
      ...given,
      circulatory: [
        [0, -0.5],
        [0, 0],
      ],
    };
    const problem = problemOf(below);
    const model = buildModel(problem);
    const adaptive = new AdaptiveModel(new FullModel(model), stateAt(model, new Map()), null);
    const point = await marginAt(adaptive, multiplier, new Map(), settingOf(problem.margin, adaptive));
    // Guard: `onAxis` in full-stability.ts, from which the command warns.
    expect(point.stability.onAxis).toBe(2);
    expect(point.stability.unstable).toBe(0);
  });
});

describe("trap 9: dashpots of low rank", () => {
  it("with their columns in the basis the reduced model is good for every rate at once", async () => {
    const given = { ...oscillators(ladder, 0.02), left: unitColumn(0), right: unitRow(0) };
    // A dashpot across the whole chain, its rate free.
    const ends = Array.from({ length: n }, (_, i) => (i % 4 === 0 ? 1 : 0));
    const dashpot = ends.map((x) => ends.map((y) => x * y));
    const base = problemOf(given);
    const problem: Problem = {
      ...base,
      matrices: new Map([
        ...base.matrices,
        ["dashpot", { name: "dashpot", form: "entries" as const, triplets: tripletsOf(dashpot, n) }],
      ]),
      terms: [
        ...base.terms,
        {
          group: "damping",
          matrix: "dashpot",
          name: "dashpot",
          factor: formula("rate", ["rate"]),
          validToHz: null,
          pointer: "/terms/damping/1",
        },
      ],
      constants: new Map([["rate", 0]]),
      margin: { ...base.margin, bandHz: band },
    };
    const model = buildModel(problem);
    const make = (rate: number) =>
      new AdaptiveModel(
        new FullModel(model),
        stateAt(model, new Map([["rate", rate]])),
        2 * Math.PI * band[1],
      );
    const adaptive = make(0);
    const setting = settingOf(problem.margin, adaptive);
    for (const rate of [0.01, 0.1, 1, 30]) {
      const values = new Map([["rate", rate]]);
      const first = radius.estimate(() => adaptive.reducedAt(stateAt(model, values)), setting).value;
      const own = (await marginAt(make(rate), radius, values, setting)).value;
      // Guard: the damping terms among the loads of #appendStaticResponses in adaptive-model.ts (the
      // dashpot's 20 columns are equal: one direction). Static responses leave a few per mille at the band's end.
      expect(Math.abs(first / own - 1)).toBeLessThan(0.02);
    }
  });
});

describe("trap 10: the loop agrees with itself at its own maximiser", () => {
  it("competing peaks within the factor are checked one by one, and the lowest value decides", async () => {
    const given = {
      ...oscillators(ladder, 0.02),
      circulatory: entries([2, 40, 0.5], [40, 2, -0.5], [6, 50, 3], [50, 6, -3]),
      left: Array.from({ length: n }, (_, i) => [i === 2 ? 0.12 : i === 6 ? 0.59 : 0]),
      right: [Array.from({ length: n }, (_, i) => (i === 2 || i === 6 ? 1 : 0))],
    };
    const point = await ask(pose(given, band), radius);
    const { records, decisive } = point.settled;
    // Guard: `competitors` in settle.ts.
    expect(new Set(records.map(({ omega }) => omega.toFixed(1))).size).toBeGreaterThan(1);
    expect(decisive!.value).toBe(Math.min(...records.slice(-2).map(({ full }) => full)));
  });

  it("a peak that the search by poles misses is brought back by the level-set test", async () => {
    const given = { ...oscillators(ladder, 0.02), left: unitColumn(2), right: unitRow(2) };
    const posed = pose(given, band);
    // A search that is blind below ω = 0.5.
    const blind: Measure = {
      ...radius,
      estimate: (pencilAt, here) => {
        const told = here.peaks.extra.length > 0;
        return radius.estimate(pencilAt, told ? here : { ...here, band: { low: 0.5, high: here.band.high } });
      },
    };
    const point = await ask(posed, blind);
    // Guard: `hints` in marginAt, point-margin.ts.
    expect(point.omega).toBeCloseTo(ladder[2]!, 2);
    expect(point.levelSetClean).toBe(true);
  });

  it("a higher peak that only the full model shows surprises the audit", async () => {
    // Dof 79 lies far above every basis; N pulls it down to ω ≈ 0.7, well damped. Of 25 channels no static response is taken.
    const far = n - 1;
    const channels = Array.from({ length: n }, (_, i) =>
      Array.from({ length: 25 }, (_, k) =>
        i === far && k === 24 ? 20 : i === 1 && k === 0 ? 1 : i === 30 + k ? 1e-3 : 0,
      ),
    );
    const given = {
      ...oscillators(ladder, 0.01),
      damping: diagonal(ladder.map((w, i) => (i === far ? 0.3 : 0.02 * w))),
      circulatory: entries([far, far, 0.5 - ladder[far]! ** 2]),
      left: channels,
      right: Array.from({ length: 25 }, (_, k) => channels.map((row) => row[k]!)),
    };
    const posed = pose(given, band);
    const state = stateAt(posed.adaptive.full.model, new Map());
    expect(
      radius.estimate(() => posed.adaptive.reducedAt(state), posed.setting).criticals[0]!.omega,
    ).toBeLessThan(0.3);
    const point = await ask(posed, radius);
    // Guard: `audit.surprised` in marginAt, point-margin.ts. 400 times the compliance of a single mode, 1.6 times the peak at dof 1, which alone the basis shows.
    const top = 1 / (0.3 * Math.sqrt(0.5 - 0.15 ** 2));
    expect(point.value).toBeCloseTo(1 / (400 * top), 8);
    expect(point.doubts).toEqual([]);
  });
});

describe("trap 11: instability just outside the band", () => {
  it.each([
    [1.05, 2],
    [1.25, 2],
    [1.4, 0],
  ])(
    "at %f of the band's end is counted apart (%i), by full and reduced models alike",
    async (factor, outside) => {
      const top = 2 * Math.PI * band[1];
      const omega = ladder.map((w, i) => (i === 20 ? factor * top : w < 1.6 && w > 1.1 ? w + 2 : w));
      const given = {
        ...oscillators(omega, 0.02),
        frictional: entries([20, 20, -0.3]),
        left: unitColumn(2),
        right: unitRow(2),
      };
      const point = await ask(pose(given, band), radius);
      // Guard: `outsideReach` in full-stability.ts.
      expect(point.stability.unstableOutside).toBe(outside);
      expect(point.stability.unstable).toBe(0);
      expect(point.value).toBeGreaterThan(0);
      expect(point.doubts).toEqual([]);
      // The same model small enough to be its own reduced model.
      const keep = [0, 1, 2, 3, 4, 20, 70];
      const cut = (rows: readonly (readonly number[])[]) => keep.map((i) => keep.map((j) => rows[i]![j]!));
      const small = pose(
        {
          mass: cut(given.mass),
          damping: cut(given.damping),
          stiffness: cut(given.stiffness),
          frictional: cut(given.frictional),
          left: keep.map((i) => given.left[i]!),
          right: [keep.map((i) => given.right[0]![i]!)],
        },
        band,
      );
      expect(small.adaptive.exact).toBe(true);
      expect((await ask(small, radius)).stability.unstableOutside).toBe(outside);
    },
  );
});

describe("wide B and C", () => {
  it("72 columns cost one direction a peak, four real vectors", () => {
    const wide = Array.from({ length: n }, (_, i) =>
      Array.from({ length: 72 }, (_, k) => Math.sin(i * k + i + 1)),
    );
    const tall = Array.from({ length: 72 }, (_, k) =>
      Array.from({ length: n }, (_, j) => Math.cos(j * k + k)),
    );
    const posed = pose({ ...oscillators(ladder, 0.02), left: wide, right: tall }, band);
    const before = posed.adaptive.order;
    expect(before).toBeLessThan(30);
    const states = statesAt(posed.adaptive.full.model, new Map());
    const { records, status } = settle(posed.adaptive, radius, states, posed.setting);
    expect(status).toBe("converged");
    // Guard: `dense.cols > 24` in adaptive-model.ts and `realDirections` in radius.ts.
    expect(posed.adaptive.order - before).toBeLessThanOrEqual(4 * records.length);
  });
});
