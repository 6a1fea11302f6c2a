/**
 * The two elements of the benchmark models. Side, Young's modulus and density are 1: deflections and slopes
 * are then of one size, and codes that do not scale the matrix themselves lose nothing by it.
 */

import { plateQuadMatrices } from "../../src/structures/plate-element.js";
import type { Element } from "./models.js";

const POISSON = 0.3;
const THICKNESS = 0.5;

/** A square of plate, half as thick as wide: deflection and two slopes a corner. */
export function square(): Element {
  const quad = { x: [0, 1, 1, 0], y: [0, 0, 1, 1], axis: [0, 0, 0, 0] };
  const { bending, area, rotary } = plateQuadMatrices(quad, POISSON);
  const inertia = THICKNESS ** 3 / 12;
  return {
    corners: [
      [0, 0, 0],
      [1, 0, 0],
      [1, 1, 0],
      [0, 1, 0],
    ],
    stiffness: bending.map((b) => inertia * b),
    mass: area.map((a, q) => THICKNESS * a + inertia * rotary[q]),
    omega: 0.06,
  };
}

/** A cube with trilinear displacements, integrated by 2×2×2 Gauss points: three displacements a corner. */
export function hexahedron(): Element {
  const corners = [0, 1, 2, 3, 4, 5, 6, 7].map((c) => [c & 1, (c >> 1) & 1, c >> 2] as const);
  const stiffness = new Float64Array(24 * 24);
  const mass = new Float64Array(24 * 24);
  const shear = 1 / (2 * (1 + POISSON));
  const lame = (2 * shear * POISSON) / (1 - 2 * POISSON);
  const weight = 1 / 8;
  for (const place of corners) {
    const at = place.map((s) => (s === 0 ? -1 : 1) / Math.sqrt(3));
    const fields = corners.map((corner) => trilinear(corner, at));
    fields.forEach((a, i) => {
      fields.forEach((b, j) => {
        const dot = a.slope[0] * b.slope[0] + a.slope[1] * b.slope[1] + a.slope[2] * b.slope[2];
        for (let k = 0; k < 3; k++) {
          for (let l = 0; l < 3; l++) {
            // ∫ λ div u div v + 2 μ ε(u) : ε(v)
            const value = lame * a.slope[k] * b.slope[l] + shear * a.slope[l] * b.slope[k];
            stiffness[3 * i + k + 24 * (3 * j + l)] += weight * (value + (k === l ? shear * dot : 0));
          }
          mass[3 * i + k + 24 * (3 * j + k)] += weight * a.value * b.value;
        }
      });
    });
  }
  return { corners, stiffness, mass, omega: 0.23 };
}

interface ShapeAt {
  readonly value: number;
  readonly slope: readonly [number, number, number];
}

function trilinear(corner: readonly number[], at: readonly number[]): ShapeAt {
  const sign = corner.map((c) => 2 * c - 1);
  const f = sign.map((s, k) => (1 + s * at[k]) / 2);
  return {
    value: f[0] * f[1] * f[2],
    slope: [sign[0] * f[1] * f[2], f[0] * sign[1] * f[2], f[0] * f[1] * sign[2]],
  };
}
