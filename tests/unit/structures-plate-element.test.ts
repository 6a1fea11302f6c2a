import { expect, it } from "vitest";
import { plateQuadMatrices } from "../../src/structures/plate-element.js";

// A convex quadrilateral without symmetry; its area by the shoelace formula.
const x = [0, 2, 2.3, -0.2];
const y = [0.1, -0.1, 1.4, 1.1];
const area =
  0.5 * Math.abs(x.reduce((sum, xi, i) => sum + xi * y[(i + 1) % 4]! - x[(i + 1) % 4]! * y[i]!, 0));
const axis = [0.3, -1, 2, 0.7];
const POISSON = 0.3;
const matrices = plateQuadMatrices({ x, y, axis }, POISSON);

/** Element dofs of a given deflection with its gradient. */
function dofsOf(
  w: (x: number, y: number) => number,
  wx: (x: number, y: number) => number,
  wy: typeof wx,
): number[] {
  return x.flatMap((xi, i) => {
    const [gx, gy] = [wx(xi, y[i]!), wy(xi, y[i]!)];
    const [cos, sin] = [Math.cos(axis[i]!), Math.sin(axis[i]!)];
    return [w(xi, y[i]!), cos * gx + sin * gy, -sin * gx + cos * gy];
  });
}

function form(a: Float64Array, q: readonly number[]): number {
  return q.reduce((sum, qi, i) => sum + qi * q.reduce((row, qj, j) => row + a[i + 12 * j]! * qj, 0), 0);
}

const zero = () => 0;
const one = () => 1;
const rigid = [dofsOf(one, zero, zero), dofsOf((px) => px, one, zero), dofsOf((_, py) => py, zero, one)];

// Entries are of order 1 to 10 and sums have some hundred terms: 1e-12 is a few hundred eps.
const TINY = 1e-12;

it("rigid motions of a plate element bend nothing", () => {
  for (const q of rigid) expect(Math.abs(form(matrices.bending, q))).toBeLessThan(TINY);
});

it("a plate element of any shape has the exact energy of constant curvature and twist", () => {
  const cylinder = dofsOf(
    (px) => px * px,
    (px) => 2 * px,
    zero,
  );
  const bowl = dofsOf(
    (px, py) => px * px + py * py,
    (px) => 2 * px,
    (_, py) => 2 * py,
  );
  const twist = dofsOf(
    (px, py) => px * py,
    (_, py) => py,
    (px) => px,
  );
  expect(form(matrices.bending, cylinder)).toBeCloseTo((4 * area) / (1 - POISSON ** 2), 11);
  expect(form(matrices.bending, bowl)).toBeCloseTo((8 * area) / (1 - POISSON), 11);
  expect(form(matrices.bending, twist)).toBeCloseTo((4 * area) / (2 * (1 + POISSON)), 11);
});

it("the mass of a plate element is exact for rigid motions", () => {
  expect(form(matrices.area, rigid[0]!)).toBeCloseTo(area, 12);
  expect(form(matrices.rotary, rigid[1]!)).toBeCloseTo(area, 12);
  expect(form(matrices.rotary, rigid[2]!)).toBeCloseTo(area, 12);
  // ∫ x dA of a polygon by Green's formula.
  const moment = x.reduce((sum, xi, i) => {
    const [xj, yi, yj] = [x[(i + 1) % 4]!, y[i]!, y[(i + 1) % 4]!];
    return sum + ((xi + xj) * (xi * yj - xj * yi)) / 6;
  }, 0);
  const shifted = dofsOf((px) => 1 + px, one, zero);
  const square = form(matrices.area, rigid[1]!);
  expect(form(matrices.area, shifted)).toBeCloseTo(area + 2 * moment + square, 11);
});

it("the matrices of a plate element are symmetric", () => {
  for (const a of Object.values(matrices) as Float64Array[]) {
    for (let i = 0; i < 12; i++)
      for (let j = 0; j < i; j++) expect(a[i + 12 * j]).toBeCloseTo(a[j + 12 * i]!, 12);
  }
});
