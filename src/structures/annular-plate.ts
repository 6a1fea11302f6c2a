/**
 * Annular plates on a polar mesh that closes around: circles `radii` × spokes `angles`.
 *
 * Dofs of a node are [w, ∂w/∂r, ∂w/(r∂θ)], so a mesh of equal sectors gives equal element matrices.
 * Nodes are numbered along each spoke from the inside out, spoke by spoke; clamped nodes have no dofs.
 */

import { invariant } from "../errors.js";
import { fromTriplets, type SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import { type PlateQuad, type PlateQuadMatrices, plateQuadMatrices } from "./plate-element.js";

export interface PolarMesh {
  /** Ascending, positive [m]; at least two. */
  readonly radii: Float64Array;
  /** Ascending within one turn [rad]; at least three. */
  readonly angles: Float64Array;
  readonly clampedInside: boolean;
  readonly clampedOutside: boolean;
}

/** Coefficient matrices over all dofs of a mesh, symmetric with both triangles; see `PlateQuadMatrices`. */
export interface PlateMatrices {
  readonly bending: SparseMatrix;
  readonly area: SparseMatrix;
  readonly rotary: SparseMatrix;
}

/** An element is named by its inner circle and its first spoke. */
export type ElementChoice = (circle: number, spoke: number) => boolean;

export const everyElement: ElementChoice = () => true;

const DOFS_PER_NODE = 3;
const ELEMENT_DOFS = 12;

function circlesWithDofs(mesh: PolarMesh): number {
  return mesh.radii.length - (mesh.clampedInside ? 1 : 0) - (mesh.clampedOutside ? 1 : 0);
}

export function plateDofs(mesh: PolarMesh): number {
  return DOFS_PER_NODE * circlesWithDofs(mesh) * mesh.angles.length;
}

/** First (deflection) dof of the node, from 0; −1 where the node is clamped. The slopes along r and θ follow it. */
export function nodeDof(mesh: PolarMesh, circle: number, spoke: number): number {
  const last = mesh.radii.length - 1;
  if ((circle === 0 && mesh.clampedInside) || (circle === last && mesh.clampedOutside)) return -1;
  const along = circle - (mesh.clampedInside ? 1 : 0);
  return DOFS_PER_NODE * ((spoke % mesh.angles.length) * circlesWithDofs(mesh) + along);
}

/**
 * Coefficient matrices of the plate, or of a layer on part of it.
 *
 * @param poisson - Poisson's ratio, dimensionless.
 * @param chosen - The elements to count; matrices keep the size of the whole plate.
 */
export function plateMatrices(mesh: PolarMesh, poisson: number, chosen: ElementChoice): PlateMatrices {
  const { radii, angles } = mesh;
  invariant(
    radii.length >= 2 && radii[0] > 0 && angles.length >= 3,
    "a polar mesh needs a hole and three spokes",
  );
  const triplets: Triplets = { rows: [], cols: [], bending: [], area: [], rotary: [] };
  for (let spoke = 0; spoke < angles.length; spoke++) {
    for (let circle = 0; circle + 1 < radii.length; circle++) {
      if (!chosen(circle, spoke)) continue;
      const element = plateQuadMatrices(sector(mesh, circle, spoke), poisson);
      addElementInto(triplets, element, sectorDofs(mesh, circle, spoke));
    }
  }
  const { rows, cols } = triplets;
  const size = plateDofs(mesh);
  return {
    bending: fromTriplets(size, size, rows, cols, triplets.bending),
    area: fromTriplets(size, size, rows, cols, triplets.area),
    rotary: fromTriplets(size, size, rows, cols, triplets.rotary),
  };
}

/** The three matrices by coordinates: they share their positions. */
interface Triplets {
  readonly rows: number[];
  readonly cols: number[];
  readonly bending: number[];
  readonly area: number[];
  readonly rotary: number[];
}

function addElementInto(target: Triplets, element: PlateQuadMatrices, dofs: Int32Array): void {
  for (let k = 0; k < ELEMENT_DOFS; k++) {
    if (dofs[k] < 0) continue;
    for (let l = 0; l < ELEMENT_DOFS; l++) {
      if (dofs[l] < 0) continue;
      target.rows.push(dofs[l]);
      target.cols.push(dofs[k]);
      target.bending.push(element.bending[l + k * ELEMENT_DOFS]);
      target.area.push(element.area[l + k * ELEMENT_DOFS]);
      target.rotary.push(element.rotary[l + k * ELEMENT_DOFS]);
    }
  }
}

/** Circle and spoke offsets of an element's corners, counter-clockwise. */
const CORNER_OFFSETS: readonly (readonly [number, number])[] = [
  [0, 0],
  [1, 0],
  [1, 1],
  [0, 1],
];

function sector({ radii, angles }: PolarMesh, circle: number, spoke: number): PlateQuad {
  const x: number[] = [];
  const y: number[] = [];
  const axis: number[] = [];
  for (const [outward, onward] of CORNER_OFFSETS) {
    const radius = radii[circle + outward];
    const angle = angles[(spoke + onward) % angles.length];
    x.push(radius * Math.cos(angle));
    y.push(radius * Math.sin(angle));
    axis.push(angle);
  }
  return { x, y, axis };
}

function sectorDofs(mesh: PolarMesh, circle: number, spoke: number): Int32Array {
  const dofs = new Int32Array(ELEMENT_DOFS);
  for (let corner = 0; corner < CORNER_OFFSETS.length; corner++) {
    const [outward, onward] = CORNER_OFFSETS[corner];
    const first = nodeDof(mesh, circle + outward, spoke + onward);
    for (let d = 0; d < DOFS_PER_NODE; d++) {
      dofs[DOFS_PER_NODE * corner + d] = first < 0 ? -1 : first + d;
    }
  }
  return dofs;
}
