import { readFileSync } from "node:fs";
import { describe, expect, it } from "vitest";
import { followerColumn } from "./follower-column.js";
import { marginOf, model, omegaOf, scaled } from "./through-files.js";

const values = JSON.parse(
  readFileSync(new URL("critical-multiplier.json", import.meta.url), "utf8"),
) as typeof import("./critical-multiplier.json");

const UNIT = [
  [1, 0],
  [0, 1],
];
const WHIRL = [
  [0, 1],
  [-1, 0],
];
const multiplier = { margin: { measure: "multiplier" } } as const;

/** The crossing is polished to a residual of 1e-14, so a closed form is met to rounding times conditioning. */
const closed = 1e-11;

function expectClose(value: number | null, expected: number, relative: number) {
  expect(value).not.toBeNull();
  expect(Math.abs(value! / expected - 1)).toBeLessThan(relative);
}

describe("rotor with cross-coupled stiffness", () => {
  it.each(values.rotor.equal)("m = $m, c = $c, k = $k: q* = c √(k/m) at √(k/m)", async ({ m, c, k }) => {
    const result = await marginOf({
      ...model({ M: scaled(m, UNIT), D: scaled(c, UNIT), K: scaled(k, UNIT), N: WHIRL }),
      ...multiplier,
    });
    // The unit of q is 1 N/m, so the multiplier goes up to a quarter of a million here.
    expectClose(result.margin.value, c * Math.sqrt(k / m), closed);
    expectClose(omegaOf(result), Math.sqrt(k / m), closed);
    expect(result.margin.loss).toBe("flutter");
    expect(result.status).toBe("trusted");
  });

  it("on unequal stiffness gains from the inequality", async () => {
    const { m, c, k1, k2, critical } = values.rotor.unequal;
    const stiffness = [
      [k1, 0],
      [0, k2],
    ];
    const result = await marginOf({
      ...model({ M: scaled(m, UNIT), D: scaled(c, UNIT), K: stiffness, N: WHIRL }),
      ...multiplier,
    });
    expectClose(result.margin.value, critical, closed);
    expect(result.status).toBe("trusted");
  });

  it.each(values.rotorDecay.cases)("q = $q has the log decrement $decrement", async ({ q, decrement }) => {
    const { m, c, k } = values.rotorDecay;
    const result = await marginOf({
      ...model({ M: scaled(m, UNIT), D: scaled(c, UNIT), K: scaled(k, UNIT), N: scaled(q, WHIRL) }),
      margin: { measure: "decay", as: "logDecrement" },
    });
    expect(result.margin.value).toBeCloseTo(decrement, 5);
    expect(result.status).toBe("trusted");
    const critical = result.measures["multiplier"];
    if (q > 0) expect(Math.round(q * critical!)).toBe(values.rotorDecay.threshold);
    else expect(critical ?? null).toBeNull();
  });
});

describe("shaft with internal damping", () => {
  it.each(values.shaft.cases)(
    "internal $internal, external $external: Ω* = √(k/m)(1 + c_e/c_i)",
    async (of) => {
      const { m, k, external, internal } = of;
      const critical = Math.sqrt(k / m) * (1 + external / internal);
      const shaft = model({
        M: scaled(m, UNIT),
        D: scaled(external + internal, UNIT),
        K: scaled(k, UNIT),
        N: WHIRL,
      });
      const result = await marginOf(
        {
          ...shaft,
          ...multiplier,
          terms: { ...shaft.terms, circulatory: [{ matrix: "N", factor: "internal*speed" }] },
          constants: { internal },
          envelope: { speed: { range: [1, 2 * critical], unit: "rad/s" } },
        },
        // At 1 rad/s the multiplier of N is the critical speed itself.
        { at: new Map([["speed", 1]]) },
      );
      expectClose(result.margin.value, critical, closed);
      expectClose(omegaOf(result), Math.sqrt(k / m), closed);
      expect(result.status).toBe("trusted");
    },
  );

  it("loses stability between two speeds either side of Ω*", async () => {
    const { m, k, external, internal } = values.shaft.cases[0]!;
    const critical = Math.sqrt(k / m) * (1 + external / internal);
    const at = (speed: number) =>
      marginOf({
        ...model({
          M: scaled(m, UNIT),
          D: scaled(external + internal, UNIT),
          K: scaled(k, UNIT),
          N: scaled(internal * speed, WHIRL),
        }),
        margin: { measure: "decay", as: "rate" },
      });
    const [below, above] = [await at(critical * (1 - 1e-6)), await at(critical * (1 + 1e-6))];
    expect(below.margin.value!).toBeGreaterThan(0);
    expect(below.unperturbed.stable).toBe(true);
    expect(above.margin.value!).toBeLessThan(0);
    expect(above.unperturbed).toMatchObject({ stable: false, unstable: 2 });
  });
});

describe("two-rod column under a follower load", () => {
  const column = (damping?: readonly [number, number]) => {
    const [d1, d2] = damping ?? [0, 0];
    const D = [
      [d1 + d2, -d2],
      [-d2, d2],
    ];
    const undamped = {
      M: [
        [3, 1],
        [1, 1],
      ],
      K: [
        [2, -1],
        [-1, 1],
      ],
      N: [
        [-1, 1],
        [0, 0],
      ],
    };
    return marginOf({ ...model(damping === undefined ? undamped : { ...undamped, D }), ...multiplier });
  };

  it.each(values.twoRods.equalDamping)("equal damping %d: 41/28 + d²/2", async (d) => {
    const result = await column([d, d]);
    expectClose(result.margin.value, 41 / 28 + (d * d) / 2, closed);
    expect(result.status).toBe("trusted");
  });

  it.each(values.twoRods.vanishingRatios)("damping ratio %d of vanishing damping", async (beta) => {
    const result = await column([1e-4 * beta, 1e-4]);
    const limit = (4 * beta ** 2 + 33 * beta + 4) / (2 * (beta ** 2 + 7 * beta + 6));
    // The limit is approached with the square of the damping, here up to (1e-3)².
    expectClose(result.margin.value, limit, 1e-6);
    expect(result.status).toBe("trusted");
  });

  it("without damping flutters at 7/2 − √2, far above the limit of vanishing damping", async () => {
    // Two modes coalesce in a defective pair: its position is known to what splits by √eps, so 1e-6.
    expectClose((await column()).margin.value, 3.5 - Math.SQRT2, 1e-6);
  });
});

describe("clamped column under a follower load", () => {
  it("with internal damping flutters at half the undamped load", async () => {
    const { elements, stiffnessProportional, load } = values.column.damped;
    const { M, K, N } = followerColumn(elements);
    const result = await marginOf({
      ...model({ M, K, N, D: scaled(stiffnessProportional, K) }),
      ...multiplier,
    });
    expect(result.margin.value).toBeCloseTo(load, 4);
    expect(result.margin.loss).toBe("flutter");
    expect(result.status).toBe("trusted");
  });

  it.each(values.column.undamped)("of $elements elements without damping flutters at $load", async (of) => {
    const result = await marginOf({ ...model({ ...followerColumn(of.elements) }), ...multiplier });
    // Half a unit of the last digit given; the defective pair itself costs √eps.
    expect(Math.abs(result.margin.value! - of.load)).toBeLessThan(6 * 10 ** -(of.digitsTrusted - 1));
  });
});

describe("mode coupling by friction", () => {
  const { k11, k12, k22, k3 } = values.friction;
  const stiffness = {
    M: UNIT,
    K: [
      [k11, k12],
      [k12, k22],
    ],
    N: [
      [0, -k3],
      [0, 0],
    ],
  };

  it.each(values.friction.cases)("damping $damping: critical friction $critical", async (of) => {
    const D = [
      [of.damping[0]!, 0],
      [0, of.damping[1]!],
    ];
    const result = await marginOf({ ...model({ ...stiffness, D }), ...multiplier });
    // Half a unit of the last digit given.
    expect(Math.abs(result.margin.value! - of.critical)).toBeLessThan(6e-11);
    expect(result.status).toBe("trusted");
    // Friction is 1 in the file, beyond the critical coefficient.
    expect(result.unperturbed).toMatchObject({ stable: false, unstable: 2 });
  });

  it("without damping starts where the modes coalesce", async () => {
    const result = await marginOf({ ...model(stiffness), ...multiplier });
    expectClose(result.margin.value, values.friction.undamped, 1e-6);
  });
});

describe("two modes of unequal damping", () => {
  const [w1, w2] = values.unequalDamping.hz.map((hz) => (2 * Math.PI * hz) ** 2) as [number, number];
  const modes = {
    M: UNIT,
    K: [
      [w1, 0],
      [0, w2],
    ],
    N: [
      [0, -w2],
      [w1, 0],
    ],
  };

  it.each(values.unequalDamping.cases)("damping $damping: $critical", async ({ damping, critical }) => {
    const D = [
      [damping[0]!, 0],
      [0, damping[1]!],
    ];
    const result = await marginOf({ ...model({ ...modes, D }), ...multiplier });
    expect(result.margin.value).toBeCloseTo(critical, 6);
    expect(result.status).toBe("trusted");
  });

  it("without damping: 19/180", async () => {
    const result = await marginOf({ ...model(modes), ...multiplier });
    expectClose(result.margin.value, values.unequalDamping.undamped, 1e-6);
  });
});

describe("moving string", () => {
  const { speed, terms, lowest } = values.string;
  const at = (f: (i: number, j: number) => number) =>
    Array.from({ length: terms }, (_, i) => Array.from({ length: terms }, (__, j) => f(i + 1, j + 1)));
  const M = at((i, j) => (i === j ? 1 : 0));
  const K = at((i, j) => (i === j ? (1 - speed ** 2) * (i * Math.PI) ** 2 : 0));
  const G = at((i, j) => ((i + j) % 2 === 1 ? (8 * speed * i * j) / (i * i - j * j) : 0));

  it("has its natural frequency near π(1 − v²), and no mode on the axis counts as unstable", async () => {
    const result = await marginOf({
      ...model({ M, G, K }),
      margin: { measure: "decay", as: "ratio", bandHz: [0.3, 0.5] },
    });
    expect(result.unperturbed).toMatchObject({ stable: true, unstable: 0, unstableOutside: 0, onAxis: 1 });
    expect(result.unperturbed.leastDamped).toHaveLength(1);
    expectClose(2 * Math.PI * result.unperturbed.leastDamped[0]!.hz, lowest, 1e-10);
    expect(Math.abs(result.margin.value!)).toBeLessThan(1e-13);
    expect(result.status).toBe("trusted");
    expect(result.warnings.join()).toContain("on the axis");
  });

  it("judged at all frequencies is stable too", async () => {
    const result = await marginOf({ ...model({ M, G, K }), margin: { measure: "decay", as: "rate" } });
    expect(result.unperturbed).toMatchObject({ stable: true, unstable: 0, onAxis: terms });
    expect(result.status).toBe("trusted");
  });

  it("keeps that frequency with a trace of damping", async () => {
    // A damping of 1e-8 K shifts the frequency by less than ζ² = 1e-16 of itself.
    const result = await marginOf({
      ...model({ M, D: scaled(1e-8, K), G, K }),
      margin: { measure: "decay", as: "ratio", bandHz: [0.3, 0.5] },
    });
    expectClose(2 * Math.PI * result.unperturbed.leastDamped[0]!.hz, lowest, 1e-10);
    expect(result.unperturbed).toMatchObject({ stable: true, onAxis: 0 });
    expect(result.margin.value!).toBeGreaterThan(0);
    expect(result.status).toBe("trusted");
  });
});
