import { describe, expect, it } from "vitest";
import { marginOf, model, type Questions } from "./through-files.js";

/**
 * Two machines side by side: one mass (m = k = 1, c = 0.2) that carries the declared error, and a
 * mode at 3 rad/s with damping −0.1 that the error does not touch. Its eigenvalue is exactly
 * 0.05 ± i√(9 − 0.05²), whatever the error does; the seen part alone has the radius c √(4mk − c²)/(2m).
 */
const seen = 0.1 * Math.sqrt(4 - 0.04);
const growth = 0.05;
const unstableHz = Math.sqrt(9 - growth ** 2) / (2 * Math.PI);

function problem(bandHz?: [number, number], mix = 0): Questions {
  const turn = (a: number, b: number) => {
    const [c, s] = [Math.cos(mix), Math.sin(mix)];
    return [
      [a * c * c + b * s * s, (a - b) * c * s],
      [(a - b) * c * s, a * s * s + b * c * c],
    ];
  };
  const direction: [[number, number], ...[number, number][]] = [
    [1, Math.cos(mix)],
    [2, Math.sin(mix)],
  ];
  return {
    ...model({ M: turn(1, 1), D: turn(0.2, 0), K: turn(1, 9), F: turn(0, -2 * growth) }),
    perturbations: [
      { name: "error", acts: "stiffness", left: direction, right: direction, size: 1, kind: "complex" },
    ],
    margin: { measure: "radius", ...(bandHz === undefined ? {} : { bandHz }) },
  };
}

// Turned by 0.7 rad both dofs take part in both modes, and the error still does not see the unstable one.
describe.each([0, 0.7])("an unstable mode that B and C do not see, dofs turned by %d", (mix) => {
  it.each([
    { name: "without a band", band: undefined },
    { name: "in the band", band: [0.05, 2] as [number, number] },
  ])("makes the radius negative, $name", async ({ band }) => {
    const result = await marginOf(problem(band, mix));
    expect(result.margin.value!).toBeLessThan(0);
    expect(result.unperturbed).toMatchObject({ stable: false, unstable: 2, unstableOutside: 0 });
    expect(result.unperturbed.abscissa!).toBeCloseTo(growth, 12);
    expect(result.margin.breaksAtHz!).toBeCloseTo(unstableHz, 12);
    expect(result.status).toBe("trusted");
    // With a band the growth is measured against its upper end.
    if (band !== undefined) expect(result.margin.value!).toBeCloseTo(-growth / (2 * Math.PI * band[1]), 12);
  });

  it("outside the band is counted apart and warned about, and leaves the verdict alone", async () => {
    // 0.477 Hz lies above the band and below 1.3 times its upper end.
    const result = await marginOf(problem([0.05, 0.4], mix));
    expect(result.margin.value! / seen).toBeCloseTo(1, 12);
    expect(result.unperturbed).toMatchObject({ stable: true, unstable: 0, unstableOutside: 2 });
    expect(result.warnings.join()).toContain("outside the band");
    expect(result.status).toBe("trusted");
  });
});
