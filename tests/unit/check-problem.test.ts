import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, it } from "vitest";
import { createRandom } from "../../src/numerics/random.js";
import { readProblem } from "../../src/problem/read-problem.js";
import { type CheckResult, checkProblem } from "../../src/tuning/check-problem.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-check-"));
afterAll(() => rmSync(folder, { recursive: true }));

let count = 0;
async function check(content: object, samples?: number): Promise<CheckResult> {
  const path = join(folder, `p${count++}.json`);
  writeFileSync(path, JSON.stringify({ format: "dampwright/1", ...content }));
  const options = { version: "test", ...(samples === undefined ? {} : { samples }) };
  return checkProblem(await readProblem(path), options, () => undefined);
}

/** Symmetric entries from the upper triangle. */
function symmetric(upper: readonly (readonly [number, number, number])[]) {
  return {
    entries: upper.flatMap(([i, j, v]) =>
      i === j
        ? [[i, j, v]]
        : [
            [i, j, v],
            [j, i, v],
          ],
    ),
  };
}

const unit = (dofs: number) => symmetric(Array.from({ length: dofs }, (_, i) => [i + 1, i + 1, 1] as const));
const term = (matrix: string, factor: string | number = 1) => ({ matrix, factor });

/** A chain of unit masses and unit springs, the first one grounded. */
function chain(dofs: number) {
  return {
    dofs,
    matrices: {
      M: unit(dofs),
      K: { links: Array.from({ length: dofs }, (_, i) => [i, i + 1, 1]) },
    },
    terms: { mass: [term("M")], stiffness: [term("K")] },
  };
}

describe("a sound model", () => {
  it("is trusted and described by its sizes and terms", async () => {
    const result = await check({
      dofs: 3,
      fixed: [3],
      matrices: {
        M: unit(3),
        K: {
          links: [
            [1, 0, 2],
            [1, 2, 1],
            [2, 3, 1],
          ],
        },
        D: { links: [[1, 2, 1]] },
      },
      constants: { rate: 5 },
      terms: {
        mass: [term("M")],
        damping: [{ ...term("D", "rate"), name: "dashpot" }],
        stiffness: [term("K")],
      },
    });
    expect(result.status).toBe("trusted");
    expect(result.doubts).toEqual([]);
    // Two diagonal entries and the pair that couples them.
    expect(result.sizes).toEqual({ dofs: 3, fixed: 1, free: 2, nonzeros: 4 });
    expect(result.terms[1]).toEqual({
      name: "dashpot",
      group: "damping",
      matrix: "D",
      nonzeros: 4,
      factor: 5,
      asymmetry: 0,
    });
    const { mass, damping, stiffness } = result.definiteness;
    expect([mass, damping, stiffness].map(({ verdict }) => verdict)).toEqual([
      "positive definite",
      "positive semidefinite",
      "positive definite",
    ]);
    expect(damping.rankDeficiency).toBe(1);
    expect(result.structure).toMatchObject({ index: 0, regular: true, masslessDofs: 0 });
    expect(result.stability).toMatchObject({ feedingTerms: false, stableByStructure: true });
    expect(result.stability.undamped.count).toBe(0);
    expect(result.effort.factorisations).toBeGreaterThan(0);
  });

  it("may have one dof, no damping and no parameters", async () => {
    const result = await check({ ...chain(1), matrices: { M: unit(1), K: symmetric([[1, 1, 4]]) } });
    expect(result.status).toBe("trusted");
    expect(result.definiteness.damping.verdict).toBe("zero");
    expect(result.definiteness.points).toBe(1);
    // ω² = 4: one 2×2-free pivot and a Rayleigh quotient, exact but for a few roundings.
    expect(result.stability.undamped.frequenciesHz[0]).toBeCloseTo(1 / Math.PI, 13);
    expect(result.model.modesCounted).toBe(1);
  });

  it("may be of first order, without mass, with everything in the circulatory term", async () => {
    const result = await check({
      dofs: 2,
      matrices: {
        I: unit(2),
        A: {
          entries: [
            [1, 1, 1],
            [1, 2, 3],
            [2, 2, 2],
          ],
        },
      },
      terms: { damping: [term("I")], circulatory: [term("A")] },
    });
    expect(result.status).toBe("trusted");
    expect(result.structure).toMatchObject({
      masslessDofs: 2,
      massRankDeficiency: 2,
      index: 1,
      regular: true,
    });
    expect(result.definiteness.mass.verdict).toBe("zero");
    expect(result.stability).toMatchObject({ feedingTerms: true, stableByStructure: true });
    expect(result.stability.undamped.count).toBe(0);
  });

  it("shows the asymmetry of a circulatory term and the skewness of a gyroscopic one", async () => {
    const skew = {
      entries: [
        [1, 2, 3],
        [2, 1, -3],
      ],
    };
    const base = chain(2);
    const result = await check({
      ...base,
      matrices: { ...base.matrices, G: skew },
      terms: { ...base.terms, gyroscopic: [term("G")], circulatory: [term("G")] },
    });
    const asymmetry = new Map(result.terms.map((row) => [row.group, row.asymmetry]));
    expect(asymmetry.get("gyroscopic")).toBe(0);
    expect(asymmetry.get("circulatory")).toBe(2);
  });

  it("with gyroscopic terms alone keeps its guarantee and is told that nothing damps it", async () => {
    const base = chain(2);
    const result = await check({
      ...base,
      matrices: {
        ...base.matrices,
        G: {
          entries: [
            [1, 2, 3],
            [2, 1, -3],
          ],
        },
      },
      terms: { ...base.terms, gyroscopic: [term("G")] },
    });
    expect(result.status).toBe("trusted");
    expect(result.stability).toMatchObject({ feedingTerms: false, stableByStructure: true });
    expect(result.stability.undamped.count).toBe(2);
    expect(result.warnings.some((text) => text.includes("no damping"))).toBe(true);
  });
});

describe("definiteness", () => {
  it("of damping is found wanting at one corner of the design box only", async () => {
    const base = chain(2);
    const result = await check(
      {
        ...base,
        matrices: { ...base.matrices, c1: symmetric([[1, 1, 1]]), c2: symmetric([[2, 2, 1]]) },
        design: { a: { range: [0, 1], start: 0.5 }, b: { range: [0, 1], start: 0.5 } },
        envelope: { load: { range: [1, 2] } },
        // Negative only where a and b are both above .9 or so: min is −.2 at (1, 1).
        terms: { ...base.terms, damping: [term("c1"), term("c2", "1.8 - a - b")], circulatory: [] },
      },
      0,
    );
    expect(result.status).toBe("unsound");
    const { damping, points, allCorners } = result.definiteness;
    expect(damping).toMatchObject({ verdict: "indefinite", negative: 1, at: { a: 1, b: 1 } });
    // Nominal and four corners: no term uses the load.
    expect(points).toBe(5);
    expect(allCorners).toBe(true);
    expect(result.doubts).toHaveLength(1);
    expect(result.stability.stableByStructure).toBe(false);
  });

  it("of mass by trial vectors would pass where inertia does not", async () => {
    // Diagonal positive, eigenvalues 3 and −1.
    const result = await check({
      dofs: 2,
      matrices: {
        M: symmetric([
          [1, 1, 1],
          [1, 2, 2],
          [2, 2, 1],
        ]),
        K: unit(2),
      },
      terms: { mass: [term("M")], stiffness: [term("K")] },
    });
    expect(result.status).toBe("unsound");
    expect(result.definiteness.mass).toMatchObject({ verdict: "indefinite", negative: 1 });
    expect(result.stability.undamped.count).toBeNull();
  });

  it("of stiffness, when lost, withdraws the guarantee but not the verdict", async () => {
    const base = chain(3);
    const result = await check({
      ...base,
      matrices: { ...base.matrices, P: unit(3), C: unit(3) },
      envelope: { load: { range: [0, 1], nominal: 0 } },
      terms: { ...base.terms, damping: [term("C")], stiffness: [term("K"), term("P", "-load")] },
    });
    expect(result.status).toBe("trusted");
    // λ(K) = 4 sin²((2k − 1)π/14) = .198, 1.555, 3.247: one lies below the load 1.
    expect(result.definiteness.stiffness).toMatchObject({
      verdict: "indefinite",
      negative: 1,
      at: { load: 1 },
    });
    expect(result.stability.stableByStructure).toBe(false);
    expect(result.warnings.some((text) => text.includes("stiffness"))).toBe(true);
  });

  it("takes what cancellation leaves of a sum for zero", async () => {
    const base = chain(2);
    // .3 − .2 − .1 = −2.8e-17 in doubles.
    const damping = [term("K", 0.3), term("K", -0.2), term("K", -0.1)];
    const result = await check({ ...base, terms: { ...base.terms, damping } });
    expect(result.definiteness.damping).toMatchObject({
      verdict: "positive semidefinite",
      rankDeficiency: 2,
    });
    expect(result.status).toBe("trusted");
  });

  it("is checked anew wherever the proportions of the terms change", async () => {
    const base = chain(2);
    const result = await check({
      ...base,
      matrices: { ...base.matrices, coupling: symmetric([[1, 2, 1]]) },
      design: { c: { range: [0.5, 1.5], start: 0.5 } },
      terms: { ...base.terms, mass: [term("M"), term("coupling", "c")] },
    });
    expect(result.definiteness.mass).toMatchObject({ verdict: "indefinite", at: { c: 1.5 } });
  });

  it("does not depend on the units of the dofs", async () => {
    // The matrix [1 .5; .5 1] with its second dof in units 1e7 times as large, and its negative twin.
    const scaled = (coupling: number) => ({
      dofs: 2,
      matrices: {
        M: symmetric([
          [1, 1, 1],
          [1, 2, coupling * 1e-7],
          [2, 2, 1e-14],
        ]),
        K: unit(2),
      },
      terms: { mass: [term("M")], damping: [term("K")], stiffness: [term("K")] },
    });
    expect((await check(scaled(0.5))).definiteness.mass.verdict).toBe("positive definite");
    expect((await check(scaled(1))).definiteness.mass).toMatchObject({
      verdict: "positive semidefinite",
      rankDeficiency: 1,
    });
    expect((await check(scaled(1.5))).definiteness.mass.verdict).toBe("indefinite");
  });

  it("is checked at all corners of the parameters in M, D and K however many others there are", async () => {
    const names = ["p", "q", "r", "s", "t", "u"];
    const unitRange = { range: [0, 1] };
    const base = chain(2);
    for (let seed = 1; seed <= 8; seed++) {
      const result = await check(
        {
          ...base,
          matrices: { ...base.matrices, N: { entries: [[1, 2, 1]] } },
          design: Object.fromEntries(names.map((name) => [name, { ...unitRange, start: 0 }])),
          envelope: { a: unitRange, b: unitRange, c: unitRange, d: unitRange },
          terms: {
            ...base.terms,
            // Negative at one of the sixteen corners.
            damping: [term("M", "1.5 - a - b + c + d")],
            circulatory: [term("N", names.join("+"))],
          },
          tune: { seed },
        },
        0,
      );
      expect(result.definiteness).toMatchObject({ points: 1 + 16, allCorners: true });
      expect(result.definiteness.damping).toMatchObject({
        verdict: "indefinite",
        negative: 2,
        at: { a: 1, b: 1, c: 0, d: 0 },
      });
    }
  });

  it("says when not all corners could be tried", async () => {
    const names = ["p", "q", "r", "s", "t"];
    const base = chain(2);
    const result = await check({
      ...base,
      design: Object.fromEntries(names.map((name) => [name, { range: [1, 2], start: 1 }])),
      terms: { ...base.terms, damping: [term("M", names.join("+"))] },
    });
    expect(result.definiteness).toMatchObject({ points: 1 + 16 + 8, allCorners: false });
  });
});

describe("index and regularity", () => {
  it("are 1 and given for a singular mass whose massless dof hangs on springs", async () => {
    const base = chain(3);
    const result = await check({ ...base, matrices: { ...base.matrices, M: unit(2) } });
    expect(result.status).toBe("trusted");
    expect(result.structure).toMatchObject({
      masslessDofs: 1,
      massRankDeficiency: 1,
      index: 1,
      regular: true,
    });
    expect(result.definiteness.mass.verdict).toBe("positive semidefinite");
  });

  it("are 1 and given for a massless dof that hangs on dashpots alone", async () => {
    const result = await check({
      dofs: 2,
      matrices: { M: symmetric([[1, 1, 1]]), K: symmetric([[1, 1, 1]]), D: { links: [[1, 2, 1]] } },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.structure).toMatchObject({ index: 1, regular: true });
    // The loose dof follows the mass: nothing damps it.
    expect(result.stability.undamped.count).toBe(1);
    expect(result.stability.undamped.frequenciesHz[0]).toBeCloseTo(1 / (2 * Math.PI), 12);
  });

  it("find nothing amiss in a mass singular along no single dof", async () => {
    const result = await check({
      dofs: 2,
      matrices: {
        M: symmetric([
          [1, 1, 1],
          [1, 2, 1],
          [2, 2, 1],
        ]),
        K: unit(2),
      },
      terms: { mass: [term("M")], stiffness: [term("K")] },
    });
    expect(result.structure).toMatchObject({
      masslessDofs: 0,
      massRankDeficiency: 1,
      index: 1,
      regular: true,
    });
  });

  it("are higher and given for a Lagrange multiplier", async () => {
    const result = await check({
      dofs: 3,
      matrices: {
        M: unit(2),
        K: unit(2),
        D: unit(2),
        constraint: symmetric([
          [1, 3, 1],
          [2, 3, -1],
        ]),
      },
      terms: { mass: [term("M")], stiffness: [term("K"), term("constraint")], damping: [term("D")] },
    });
    expect(result.structure).toMatchObject({ index: "higher", regular: true });
    expect(result.status).toBe("trusted");
  });

  it("count coupling through gyroscopic terms", async () => {
    // q₂ is massless and has neither spring nor dashpot, but G couples it to q₁'': S_ZZ − C_Z1 M₁⁻¹ C_1Z = 1.
    const result = await check({
      dofs: 2,
      matrices: {
        M: symmetric([[1, 1, 1]]),
        K: symmetric([[1, 1, 1]]),
        G: {
          entries: [
            [1, 2, 1],
            [2, 1, -1],
          ],
        },
      },
      terms: { mass: [term("M")], stiffness: [term("K")], gyroscopic: [term("G")] },
    });
    expect(result.structure).toMatchObject({ index: 1, regular: true });
  });

  it("are higher where the kernel of the dashpots meets no stiffness", async () => {
    // Massless dofs 2 and 3 with a dashpot between them; moving together their springs 1 and −1 cancel.
    const result = await check({
      dofs: 3,
      matrices: {
        M: symmetric([[1, 1, 1]]),
        K: symmetric([
          [1, 1, 1],
          [2, 2, 1],
          [3, 3, -1],
        ]),
        D: { links: [[2, 3, 1]] },
      },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.structure).toMatchObject({ index: "higher", regular: true });
    expect(result.definiteness.stiffness.verdict).toBe("indefinite");
    expect(result.stability.undamped.count).toBeNull();
    // The inertia of K − ω²M counts the negative spring besides the mode.
    expect(result.model.modesCounted).toBeNull();
  });

  it("are not determined on large models beyond what massless dofs and dashpots tell", async () => {
    const dofs = 410;
    const base = chain(dofs);
    const diagonal = Array.from({ length: dofs - 2 }, (_, i) => [i + 1, i + 1, 1] as const);
    const together = [
      [dofs - 1, dofs - 1, 1],
      [dofs - 1, dofs, 1],
      [dofs, dofs, 1],
    ] as const;
    const margin = { bandHz: [0, 0.001] };
    const slanted = await check({
      ...base,
      matrices: { M: symmetric([...diagonal, ...together]), K: base.matrices.K },
      margin,
    });
    expect(slanted.structure).toMatchObject({
      masslessDofs: 0,
      massRankDeficiency: 1,
      index: "not determined",
    });
    // C = [1 1; 0 0] on the massless dofs: its kernel is slanted, and the springs on it cancel.
    const friction = {
      entries: [
        [dofs - 1, dofs - 1, 1],
        [dofs - 1, dofs, 1],
      ],
    };
    const rubbed = await check({
      ...base,
      matrices: { M: symmetric(diagonal), K: base.matrices.K, F: friction },
      terms: { ...base.terms, frictional: [term("F")] },
      margin,
    });
    expect(rubbed.structure).toMatchObject({ masslessDofs: 2, index: "not determined" });
  });

  it("see no singular pencil in a real eigenvalue that happens to be tried", async () => {
    // P(s) = s² − 1 vanishes at s = 1, the model's own frequency.
    const base = chain(1);
    const result = await check({ ...base, terms: { mass: [term("M")], stiffness: [term("K", -1)] } });
    expect(result.structure.regular).toBe(true);
  });

  it("name the dofs of a singular model: two unconnected massless dofs without stiffness", async () => {
    const result = await check({
      dofs: 5,
      fixed: [1],
      matrices: {
        M: symmetric([
          [2, 2, 1],
          [5, 5, 1],
        ]),
        K: symmetric([
          [2, 2, 1],
          [5, 5, 3],
        ]),
        D: symmetric([[2, 2, 1]]),
      },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.status).toBe("unsound");
    expect(result.structure).toMatchObject({ regular: false, index: "higher", undeterminedDofs: [3, 4] });
    expect(result.doubts[0]).toContain("3, 4");
    expect(result.stability.stableByStructure).toBe(false);
  });

  it("find a free massless body whose springs cancel only in exact arithmetic", async () => {
    const random = createRandom(3);
    const bodies = Array.from({ length: 20 }, (_, k) => 3 + (k % 8));
    for (const size of bodies) {
      const spring = () => 0.01 + random.uniform();
      const ring = Array.from({ length: size }, (_, i) => [2 + i, 2 + ((i + 1) % size), spring()]);
      const result = await check({
        dofs: size + 1,
        matrices: { M: unit(1), K: { links: [[1, 0, 0.3], ...ring, [2, 4, spring()]] } },
        terms: { mass: [term("M")], damping: [term("M")], stiffness: [term("K")] },
      });
      expect(result.structure.regular).toBe(false);
      expect(result.structure.undeterminedDofs).toHaveLength(Math.min(5, size));
      expect(result.structure.undeterminedDofs).not.toContain(1);
    }
  });

  it("are checked at corners too: a dof whose only spring may vanish", async () => {
    const result = await check({
      dofs: 2,
      matrices: { M: symmetric([[1, 1, 1]]), K: symmetric([[1, 1, 1]]), k: symmetric([[2, 2, 1]]) },
      design: { spring: { range: [0, 1], start: 1 } },
      terms: { mass: [term("M")], damping: [term("M")], stiffness: [term("K"), term("k", "spring")] },
    });
    expect(result.status).toBe("unsound");
    expect(result.structure).toMatchObject({
      regular: false,
      singularAt: { spring: 0 },
      undeterminedDofs: [2],
    });
  });

  it("agree between the dense and the sparse way", async () => {
    for (const held of ["K", "D"] as const) {
      for (const dofs of [60, 460]) {
        const base = chain(dofs);
        // Every third dof is massless; it hangs on its neighbours' springs, or on dashpots besides.
        const massive = Array.from({ length: dofs }, (_, i) => i + 1).filter((i) => i % 3 !== 0);
        const result = await check({
          ...base,
          matrices: { M: symmetric(massive.map((i) => [i, i, 1] as const)), K: base.matrices.K },
          terms: { ...base.terms, damping: held === "D" ? [term("K")] : [] },
          margin: { bandHz: [0, 0.001] },
        });
        expect(result.structure).toMatchObject({
          masslessDofs: Math.floor(dofs / 3),
          index: 1,
          regular: true,
        });
      }
    }
    for (const dofs of [60, 460]) {
      const base = chain(dofs - 1);
      const result = await check({
        ...base,
        dofs,
        matrices: { ...base.matrices, constraint: symmetric([[dofs - 1, dofs, 1]]) },
        terms: { ...base.terms, stiffness: [term("K"), term("constraint")] },
        margin: { bandHz: [0, 0.001] },
      });
      expect(result.structure).toMatchObject({ index: "higher", regular: true });
    }
  });
});

describe("modes that no damping reaches", () => {
  it("are counted with their frequencies", async () => {
    // Two equal masses side by side, the dashpot between them: the motion in step, ω² = 1, is not damped.
    const result = await check({
      dofs: 2,
      matrices: {
        M: unit(2),
        K: {
          links: [
            [1, 0, 1],
            [2, 0, 1],
            [1, 2, 1],
          ],
        },
        D: { links: [[1, 2, 0.1]] },
      },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.status).toBe("trusted");
    const { undamped } = result.stability;
    expect(undamped.count).toBe(1);
    expect(undamped.frequenciesHz[0]).toBeCloseTo(1 / (2 * Math.PI), 12);
    expect(result.stability.stableByStructure).toBe(true);
    expect(result.warnings).toHaveLength(1);
  });

  it("are found inside a multiple eigenvalue", async () => {
    // Three equal oscillators; the dashpot sees the sum of their motions, two combinations escape it.
    const result = await check({
      dofs: 3,
      matrices: {
        M: unit(3),
        K: unit(3),
        D: {
          outer: {
            left: [
              [1, 1],
              [2, 1],
              [3, 1],
            ],
            right: [
              [1, 1],
              [2, 1],
              [3, 1],
            ],
          },
        },
      },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.stability.undamped.count).toBe(2);
  });

  it("include rigid motion, at 0 Hz", async () => {
    const result = await check({
      dofs: 2,
      matrices: { M: unit(2), K: { links: [[1, 2, 1]] }, D: { links: [[1, 2, 1]] } },
      terms: { mass: [term("M")], stiffness: [term("K")], damping: [term("D")] },
    });
    expect(result.stability.undamped).toMatchObject({ count: 1, frequenciesHz: [0] });
    expect(result.definiteness.stiffness.verdict).toBe("positive semidefinite");
  });

  it("do not include what is no oscillation", async () => {
    const result = await check({
      dofs: 2,
      matrices: {
        M: unit(2),
        K: symmetric([
          [1, 1, -1],
          [2, 2, 4],
        ]),
      },
      terms: { mass: [term("M")], stiffness: [term("K")] },
    });
    expect(result.stability.undamped.count).toBe(1);
    expect(result.stability.undamped.frequenciesHz[0]).toBeCloseTo(1 / Math.PI, 12);
  });

  it("are looked for up to the band's upper end", async () => {
    const band = (high: number) => check({ ...chain(40), margin: { bandHz: [0, high] } });
    // ω_k = 2 sin((2k − 1)π/162): below 2π·.05 = .3142 lie k = 1 … 4 (the fourth .2707, the fifth .3473).
    const low = await band(0.05);
    expect(low.stability.undamped.count).toBe(4);
    expect(low.stability.undamped.searchedToHz).toBeCloseTo(0.05, 12);
    // Residuals of Lanczos are 1e-9, squared by the Rayleigh quotient.
    const fourth = (2 * Math.sin((7 * Math.PI) / 162)) / (2 * Math.PI);
    expect(low.stability.undamped.frequenciesHz[3]! / fourth).toBeCloseTo(1, 11);
    expect((await band(1)).stability.undamped.count).toBe(40);
    expect((await check(chain(40))).stability.undamped.count).toBe(40);
  });

  it("do not exist under a trace of background damping", async () => {
    const base = chain(40);
    const result = await check({ ...base, terms: { ...base.terms, damping: [term("K", 1e-6)] } });
    expect(result.stability.undamped.count).toBe(0);
  });

  it("are left open above 300 dofs without a band", async () => {
    const result = await check(chain(301));
    expect(result.stability.undamped.count).toBeNull();
    expect(result.stability.undamped.reason).not.toBeNull();
  });
});

it("a factor that is undefined somewhere in the ranges makes the model unsound", async () => {
  const base = chain(2);
  const result = await check({
    ...base,
    envelope: { speed: { range: [0, 10], nominal: 5 } },
    terms: { ...base.terms, damping: [term("M", "1/speed")] },
  });
  expect(result.status).toBe("unsound");
  expect(result.doubts).toHaveLength(1);
  expect(result.doubts[0]).toContain("speed = 0");
  expect(result.stability.stableByStructure).toBe(false);
});
