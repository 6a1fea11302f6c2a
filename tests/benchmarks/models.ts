/**
 * Seeded models on structured grids, clamped on one side, and their dynamic stiffness
 *
 *     P(iω) = K − ω²M + iω (D + G) + N
 *
 * at an ω inside the spectrum: light damping D = η K / ω, and small random N and antisymmetric G on the
 * pattern of K, so that P is symmetric in structure only. The stiffness of the elements scatters by ±10 %.
 * Nothing but +, −, ×, ÷ and square roots goes into the values, so they are the same on every machine.
 */

import { createRandom, type Random } from "../../src/numerics/random.js";
import type { ComplexValues, SparseMatrix, SparsePattern } from "../../src/numerics/sparse/sparse-matrix.js";
import { hexahedron, square } from "./elements.js";

export type Shape = "plate" | "slab" | "cube";

const shapes: readonly Shape[] = ["plate", "slab", "cube"];

export function shapeNamed(name: string | undefined): Shape | undefined {
  return shapes.find((shape) => shape === name);
}

export interface BenchmarkModel {
  readonly pattern: SparsePattern;
  /** Node of each dof. */
  readonly groups: Int32Array;
  /** P(iω). */
  readonly dynamic: ComplexValues;
  /** K − ω²M. */
  readonly undamped: SparseMatrix;
}

/** Coefficients of one element, all elements being alike: symmetric matrices of its 3 dofs per corner. */
export interface Element {
  /** Offsets of the corners from the element's place in the grid. */
  readonly corners: readonly (readonly [number, number, number])[];
  readonly stiffness: Float64Array;
  readonly mass: Float64Array;
  /** A frequency with some tens of modes below it in a model of 10 000 dofs. */
  readonly omega: number;
}

/** Loss factor of the damping, and sizes of N and G against K. */
const LOSS = 0.01;
const FEEDING = 0.02;
const DOFS = 3;
const SLAB_LAYERS = 4;

/** Numbers of free nodes along x, y, z; the clamped nodes stand at x = −1. */
export type Grid = readonly [x: number, y: number, z: number];

/** The grid of about so many dofs. */
export function gridOf(shape: Shape, dofs: number): Grid {
  const nodes = dofs / DOFS;
  const near = (wanted: number): number => Math.max(1, Math.round(wanted));
  if (shape === "cube") {
    const side = near(Math.cbrt(nodes));
    return [near(nodes / side ** 2), side, side];
  }
  const layers = shape === "slab" ? SLAB_LAYERS + 1 : 1;
  const side = near(Math.sqrt(nodes / layers));
  return [near(nodes / layers / side), side, layers];
}

/** The same seed gives the same numbers. */
export function benchmarkModel(shape: Shape, dofs: number, seed: number): BenchmarkModel {
  return modelOn(gridOf(shape, dofs), shape === "plate" ? square() : hexahedron(), createRandom(seed));
}

export function modelOn(grid: Grid, element: Element, random: Random): BenchmarkModel {
  const { corners, omega } = element;
  const pattern = gridPattern(grid);
  const entries = pattern.rowIndex.length;
  const dynamic = { re: new Float64Array(entries), im: new Float64Array(entries) };
  const undamped = new Float64Array(entries);
  const size = DOFS * corners.length;
  const deep = Math.max(...corners.map((c) => c[2]));
  for (let z = 0; z + deep < grid[2]; z++) {
    for (let y = 0; y + 1 < grid[1]; y++) {
      for (let x = -1; x + 1 < grid[0]; x++) {
        const spread = 0.9 + 0.2 * random.uniform();
        for (let q = 0; q < size * size; q++) {
          const i = q % size;
          const j = (q - i) / size;
          const from = corners[(i - (i % DOFS)) / DOFS];
          const to = corners[(j - (j % DOFS)) / DOFS];
          const n = FEEDING * (2 * random.uniform() - 1);
          const g = FEEDING * (i < j ? 1 : -1) * (2 * random.uniform() - 1);
          if (x + from[0] < 0 || x + to[0] < 0) continue;
          const column = DOFS * nodeAt(grid, x + to[0], y + to[1], z + to[2]) + (j % DOFS);
          const p = pattern.colStart[column] + DOFS * rankOf(grid, x, y, z, from, to) + (i % DOFS);
          const k = spread * element.stiffness[q];
          const real = k - omega * omega * element.mass[q];
          undamped[p] += real;
          dynamic.re[p] += real + n * k;
          dynamic.im[p] += LOSS * k + g * k;
        }
      }
    }
  }
  const groups = Int32Array.from({ length: pattern.cols }, (_, dof) => Math.floor(dof / DOFS));
  return { pattern, groups, dynamic, undamped: { ...pattern, values: undamped } };
}

const nodeAt = ([nx, ny]: Grid, x: number, y: number, z: number): number => x + nx * (y + ny * z);

/** Place of the node `from` among the neighbours of the node `to`, both offsets from (x, y, z). */
function rankOf(
  grid: Grid,
  x: number,
  y: number,
  z: number,
  from: readonly [number, number, number],
  to: readonly [number, number, number],
): number {
  const ix = x + to[0];
  const iy = y + to[1];
  const iz = z + to[2];
  const wide = Math.min(ix + 1, grid[0] - 1) - Math.max(ix - 1, 0) + 1;
  const high = Math.min(iy + 1, grid[1] - 1) - Math.max(iy - 1, 0) + 1;
  return (
    x +
    from[0] -
    Math.max(ix - 1, 0) +
    wide * (y + from[1] - Math.max(iy - 1, 0) + high * (z + from[2] - Math.max(iz - 1, 0)))
  );
}

/** Every node is coupled with the nodes one step away along each axis, corners of the box included. */
function gridPattern(grid: Grid): SparsePattern {
  const [nx, ny, nz] = grid;
  const order = DOFS * nx * ny * nz;
  const span = (i: number, n: number): number => Math.min(i + 1, n - 1) - Math.max(i - 1, 0) + 1;
  const colStart = new Int32Array(order + 1);
  for (let z = 0, j = 0; z < nz; z++) {
    for (let y = 0; y < ny; y++) {
      for (let x = 0; x < nx; x++) {
        const entries = DOFS * span(x, nx) * span(y, ny) * span(z, nz);
        for (let d = 0; d < DOFS; d++, j++) colStart[j + 1] = colStart[j] + entries;
      }
    }
  }
  const rowIndex = new Int32Array(colStart[order]);
  for (let j = 0; j < order; j++) {
    const node = Math.floor(j / DOFS);
    const x = node % nx;
    const y = Math.floor(node / nx) % ny;
    const z = Math.floor(node / (nx * ny));
    let p = colStart[j];
    for (let c = Math.max(z - 1, 0); c <= Math.min(z + 1, nz - 1); c++) {
      for (let b = Math.max(y - 1, 0); b <= Math.min(y + 1, ny - 1); b++) {
        for (let a = Math.max(x - 1, 0); a <= Math.min(x + 1, nx - 1); a++) {
          for (let d = 0; d < DOFS; d++) rowIndex[p++] = DOFS * nodeAt(grid, a, b, c) + d;
        }
      }
    }
  }
  return { rows: order, cols: order, colStart, rowIndex };
}
