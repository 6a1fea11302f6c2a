import { expect, it } from "vitest";
import { multiplyAddInto, type SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";
import {
  everyElement,
  nodeDof,
  type PolarMesh,
  plateDofs,
  plateMatrices,
} from "../../src/structures/annular-plate.js";

const free: PolarMesh = {
  radii: Float64Array.of(0.5, 0.7, 1),
  angles: Float64Array.of(0, 1, 1.7, 3, 4.4, 5.5),
  clampedInside: false,
  clampedOutside: false,
};
const clamped: PolarMesh = { ...free, clampedInside: true };

function form(a: SparseMatrix, q: Float64Array): number {
  const y = new Float64Array(a.rows);
  multiplyAddInto(y, 1, a, q);
  return y.reduce((sum, yi, i) => sum + yi * q[i]!, 0);
}

/** Dofs of the rigid motion w = a + b x + c y. */
function rigid(a: number, b: number, c: number): Float64Array {
  const q = new Float64Array(plateDofs(free));
  free.angles.forEach((angle, spoke) => {
    free.radii.forEach((radius, circle) => {
      const along = b * Math.cos(angle) + c * Math.sin(angle);
      const across = -b * Math.sin(angle) + c * Math.cos(angle);
      q.set([a + radius * along, along, across], nodeDof(free, circle, spoke));
    });
  });
  return q;
}

it("dofs are numbered spoke by spoke from the inside out, without the clamped nodes", () => {
  expect(plateDofs(free)).toBe(54);
  expect(plateDofs(clamped)).toBe(36);
  expect([0, 1, 2].map((circle) => nodeDof(clamped, circle, 1))).toEqual([-1, 6, 9]);
  expect(nodeDof(free, 2, 6)).toBe(nodeDof(free, 2, 0));
});

it("rigid motions of a free annulus bend nothing and carry the area of its polygons", () => {
  const { bending, area } = plateMatrices(free, 0.3, everyElement);
  for (const q of [rigid(1, 0, 0), rigid(0, 1, 0), rigid(0.2, -1, 2)]) {
    expect(Math.abs(form(bending, q))).toBeLessThan(1e-10); // entries reach 1e3, times some hundred eps
  }
  const sines = [...free.angles].reduce((sum, angle, j) => {
    const next = free.angles[j + 1] ?? 2 * Math.PI;
    return sum + Math.sin(next - angle);
  }, 0);
  expect(form(area, rigid(1, 0, 0))).toBeCloseTo(((1 - 0.25) / 2) * sines, 12);
});

it("the matrices of the parts of a plate add up to those of the whole", () => {
  const whole = plateMatrices(clamped, 0.3, everyElement).bending;
  const inner = plateMatrices(clamped, 0.3, (circle) => circle === 0).bending;
  const outer = plateMatrices(clamped, 0.3, (circle) => circle !== 0).bending;
  const q = Float64Array.from({ length: plateDofs(clamped) }, (_, i) => Math.sin(i + 1));
  expect(form(inner, q) + form(outer, q)).toBeCloseTo(form(whole, q), 8); // of some 1e4
});
