import { describe, expect, it } from "vitest";
import { checkText } from "../../src/report/check-text.js";
import { marginText } from "../../src/report/margin-text.js";
import { numberText, valueBeside } from "../../src/report/number-text.js";
import { columnLines, page, wrap } from "../../src/report/text-layout.js";
import { tuneText } from "../../src/report/tune-text.js";
import { vectorsCsv } from "../../src/report/vectors-csv.js";
import type { CheckResult } from "../../src/tuning/check-problem.js";
import { marginCase, tuneCase } from "./report-cases.js";

describe("numbers", () => {
  it("have four significant digits and a power of ten only far from one", () => {
    const given = [0, 1, -0.012345678, 123456, 2.5e6, 9.99999e5, 1.2345678e-9, null];
    expect(given.map((x) => numberText(x))).toEqual([
      "0",
      "1",
      "-0.01235",
      "123500",
      "2.5e6",
      "1e6",
      "1.235e-9",
      "none",
    ]);
  });

  it("that miss their target by a hair get the digits that show it", () => {
    expect(valueBeside(1, 0.9999987)).toBe("0.999999");
    expect(valueBeside(1, 1)).toBe("1");
    expect(valueBeside(null, 0.9999987)).toBe("1");
  });
});

describe("the layout", () => {
  it("breaks lines at blanks only", () => {
    expect(wrap("one two three", 7)).toEqual(["one two", "three"]);
    expect(wrap("incomprehensible word", 7)).toEqual(["incomprehensible", "word"]);
  });

  it("aligns columns of unequal rows", () => {
    expect(columnLines([["a", "bb"], ["ccc"]])).toEqual(["  a    bb", "  ccc"]);
  });

  it("lets no control character of a title reach the terminal", () => {
    expect(page([["red \u001b[31m"], []])).toBe("red  [31m\n");
  });
});

const fits = (text: string) => text.split("\n").every((line) => line.length <= 80);

describe("the summary of a margin", () => {
  it("gives the answer first and the evidence after it, in 80 columns", () => {
    const text = marginText(marginCase);
    expect(fits(text)).toBe(true);
    expect(text).toMatchInlineSnapshot(`
      "Slewing ring brake, second sample

        margin        0.8341, complex stability radius, target 1 MISSED
                      withstands model errors up to 0.8341 times the declared one
        breaks at     391.2 Hz by flutter, at friction = 0.55, speed = 12.35 rad/s
        between       0.834123 and 0.834124
        next          0.95 at 612.6 Hz
        also          critical multiplier 1.235, damping ratio 0.123 %

        fed by        rub 87 %, declared error 13 %
        damped by     background 94 %, loss of layer 5 %, others 0.8 %
        stability     stable as it stands, slowest decay 1.23 1/s, 2 growing
                      eigenvalues outside the band
        least damped  391.3 Hz (0.123 %), 612.6 Hz (0.235 %)

        mass          0.93 of 12 kg
        cost          412.5 of 400, EXCEEDED

        model         10005 dofs, 71 modes counted, searched up to 2600 Hz
        evidence      trusted, witness residual 3.2e-15, audit off by 2.1e-9 at worst
                      in 12 full-model evaluations, 1 other operating point, the
                      lowest at 1.3
        effort        21 factorisations, reduced order 98, 143 reduced evaluations,
                      12.3 s
        warning       2 unstable eigenvalues lie outside the band; the verdict is
                      about the band only.

      A computed margin is no release: it covers the declared model error and nothing
      else.
      Follow the codes that apply where the machine runs, test it, and have a
      qualified engineer decide.
      "
    `);
  });

  it("says of an unstable design how fast it grows and where its power comes from", () => {
    const margin = { ...marginCase.margin, value: -7.75e-5 };
    const { unperturbed } = tuneCase.before;
    const balance = [
      { name: "background", group: "damping", power: 0.56 },
      { name: "rub", group: "circulatory", power: -1 },
      { name: "stored energy", group: "growth", power: 0.44 },
    ];
    const text = marginText({ ...marginCase, margin, unperturbed, balance });
    expect(text).toContain("UNSTABLE: grows at 3.21 1/s near 391.2 Hz as it stands,\n");
    expect(text).toContain("no distance");
    expect(text).toContain("at 1.3");
    const audit = { ...marginCase.audit, envelope: [{ at: {}, value: -1e-5 }] };
    expect(marginText({ ...marginCase, margin, audit })).toContain("unstable too");
    expect(text).toContain("background 56 %, 44 % are left and make it grow");
    expect(text).not.toMatch(/between|next/);
  });

  it("says of a decay what its value is and what the energy was", () => {
    const margin = { ...marginCase.margin, measure: "decay", kind: "ratio", value: -0.01 } as const;
    const balance = [{ name: "stored energy", group: "growth", power: -0.9 }];
    const text = marginText({ ...marginCase, margin, balance });
    expect(text).toContain("damping ratio -0.01\n");
    expect(text).toContain("its own energy as it dies out 90 %");
  });

  it("says of a multiplier below one that the machine as it stands is beyond it", () => {
    const margin = { ...marginCase.margin, measure: "multiplier", kind: null } as const;
    expect(marginText({ ...marginCase, margin })).toContain("stable only up to 0.8341 times");
    expect(marginText({ ...marginCase, margin: { ...margin, value: 2 } })).toContain("stable up to 2 times");
  });

  it("says so when nothing was audited yet", () => {
    const audit = { ...marginCase.audit, evaluations: 0, worst: 0 };
    expect(marginText({ ...marginCase, audit })).toContain("no audit yet");
  });

  it("says so when nothing was found to break", () => {
    const margin = {
      ...marginCase.margin,
      value: null,
      between: [null, null] as const,
      loss: null,
      breaksAtHz: null,
      at: {},
      meetsTarget: true,
    };
    const text = marginText({ ...marginCase, margin, witness: null, budget: {} });
    expect(text).toContain("none, complex stability radius, target 1 reached");
    expect(text).toContain("nowhere that was searched");
    expect(text).not.toContain("between");
  });

  it("shouts when it is not to be trusted and gives the reasons", () => {
    const text = marginText({ ...marginCase, status: "untrusted", doubts: ["the audit failed"] });
    expect(text).toContain("NOT TO BE TRUSTED");
    expect(text).toContain("doubt         the audit failed");
  });
});

describe("the summary of a tuning", () => {
  it("sets before and after side by side, in 80 columns", () => {
    const text = tuneText(tuneCase);
    expect(fits(text)).toBe(true);
    expect(text).toMatchInlineSnapshot(`
      "Slewing ring brake, second sample

        margin        1.031, complex stability radius, target 1 reached
                      withstands model errors up to 1.031 times the declared one
        breaks at     612.6 Hz by flutter, at friction = 0.55, speed = 12.35 rad/s
        between       1.03123 and 1.03124

                   before    after
        margin     unstable  1.031
        growth     3.21      -1.23    1/s (below 0: dies out)
        breaks at  390.6     612.6    Hz
        by         flutter   flutter
        friction   0.55      0.55     (worst)
        speed      12.35     12.35    rad/s (worst)
        tailRate   50        612.3    N s/m
        layer      0.002     0.0035   m
        mass       0.93      11.99    of 12 kg
        cost       92        400      of 400

        next          0.95 at 612.6 Hz
        also          critical multiplier 1.235, damping ratio 0.123 %
        fed by        rub 87 %, declared error 13 %
        damped by     background 94 %, loss of layer 5 %, others 0.8 %
        stability     stable as it stands, slowest decay 1.23 1/s
        least damped  391.3 Hz (0.123 %), 612.6 Hz (0.235 %)

        starts        2 ascents ended between 0.9123 and 1.04 on the reduced model
        rounds        2, confirmed on the full model: 0.9876, 1.031
        steps         rounded to feasible purchasable steps and evaluated anew
        model         10005 dofs, 71 modes counted, searched up to 2600 Hz
        evidence      trusted, witness residual 3.2e-15, audit off by 2.1e-9 at worst
                      in 12 full-model evaluations, 1 other operating point, the
                      lowest at 1.3
        effort        21 factorisations (17 before the audit), reduced order 98, 143
                      reduced evaluations, 12.3 s, seed 1

      A computed margin is no release: it covers the declared model error and nothing
      else.
      Follow the codes that apply where the machine runs, test it, and have a
      qualified engineer decide.
      "
    `);
  });

  it("clips long names and leaves out what there is not", () => {
    const name = "x".repeat(100);
    const design = { [name]: 1 };
    const before = { ...tuneCase.before, design, budget: {} };
    const text = tuneText({ ...tuneCase, design, before, history: [], starts: [], rounded: false });
    expect(fits(text)).toBe(true);
    expect(text).not.toMatch(/rounds|starts|steps/);
    expect(text).toMatch(/mass +none +11\.99/);
  });
});

const definite = {
  verdict: "positive definite",
  negative: 0,
  at: null,
  rankDeficiency: 0,
  proved: true,
} as const;

const { margin, measures, design, budget, unperturbed, competing, witness, audit, ...common } = marginCase;

const checkCase: CheckResult = {
  ...common,
  command: "check",
  status: "unsound",
  doubts: ["The damping matrix is indefinite: 1 negative eigenvalues at layer = 0.008."],
  warnings: [],
  sizes: { dofs: 12, fixed: 2, free: 10, nonzeros: 46 },
  terms: [
    { name: "ring", group: "mass", matrix: "Mring", nonzeros: 46, factor: 1, asymmetry: 0 },
    { name: "y".repeat(90), group: "circulatory", matrix: "rub", nonzeros: 4, factor: 4.2e7, asymmetry: 1 },
  ],
  definiteness: {
    mass: definite,
    damping: { ...definite, verdict: "indefinite", negative: 1, at: { layer: 0.008 }, proved: false },
    stiffness: definite,
    points: 13,
    allCorners: true,
  },
  structure: {
    masslessDofs: 1,
    massRankDeficiency: 1,
    index: 1,
    regular: true,
    regularityPoints: 13,
    singularAt: null,
    undeterminedDofs: [],
  },
  stability: {
    feedingTerms: true,
    stableByStructure: false,
    undamped: { count: 5, frequenciesHz: [1, 2, 3, 4.5678, 6], searchedToHz: 2000, reason: null },
  },
};

describe("the summary of a check", () => {
  it("gives the verdict first, then why, then the matrices, in 80 columns", () => {
    const text = checkText(checkCase);
    expect(fits(text)).toBe(true);
    expect(text).toMatchInlineSnapshot(`
      "Slewing ring brake, second sample
      UNSOUND MODEL

        model       unsound, 1 fault
        doubt       The damping matrix is indefinite: 1 negative eigenvalues at layer
                    = 0.008.
        stability   structure guarantees nothing
        undamped    5 modes up to 2000 Hz that no damping reaches: 1, 2, 3, 4.568, …
                    Hz
        size        12 dofs, 2 fixed, 10 free, 46 places in the merged pattern
        mass        positive definite
        damping     INDEFINITE, 1 negative eigenvalue, worst at layer = 0.008 m, not
                    proved everywhere
        stiffness   positive definite
        checked at  13 points, all corners among them
        structure   regular pencil, index 1, 1 massless dof, mass matrix short of full
                    rank by 1
        effort      21 factorisations, reduced order 98, 143 reduced evaluations,
                    12.3 s

        term                              group        entries  factor  asymmetry
        ring                              mass         46       1       0
        yyyyyyyyyyyyyyyyyyyyyyyyyyyyyyy…  circulatory  4        4.2e7   1

      A computed margin is no release: it covers the declared model error and nothing
      else.
      Follow the codes that apply where the machine runs, test it, and have a
      qualified engineer decide.
      "
    `);
  });

  it("of a sound model says what its structure guarantees", () => {
    const stability = {
      feedingTerms: false,
      stableByStructure: true,
      undamped: { count: 0, frequenciesHz: [], searchedToHz: null, reason: null },
    };
    const text = checkText({ ...checkCase, status: "trusted", doubts: [], stability });
    expect(text).toContain("model       sound\n");
    expect(text).toContain("nothing feeds energy in");
    expect(text).toContain("damping reaches every mode\n");
  });
});

it("the worst vector is written one dof a line, in pieces that join", () => {
  const n = 5000;
  const dofs = Int32Array.from({ length: n }, (_, k) => k + 1);
  const re = new Float64Array(n).fill(3);
  const im = new Float64Array(n).fill(-4);
  const lines = [...vectorsCsv({ dofs, re, im })].join("").split("\n");
  expect(lines).toHaveLength(n + 2);
  expect(lines.slice(0, 2)).toEqual(["dof,re,im,modulus", "1,3,-4,5"]);
  expect(lines[n]).toBe("5000,3,-4,5");
});
