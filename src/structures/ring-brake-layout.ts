/**
 * Where things stand on the ring brake: a polar mesh fitted to the pads, the nodes that each pad
 * touches and the share of the contact stiffness that each of them carries.
 */

import { InputError } from "../errors.js";
import { nodeDof, type PolarMesh } from "./annular-plate.js";

/** Geometry in metres and degrees; an invented machine. */
export const geometry = {
  innerRadius: 0.9,
  outerRadius: 1.3,
  /** The pads run outside this radius: the outer 60 % of the width. */
  rubRadius: 1.06,
  /** Unequal spacing: equal spacing leaves double modes that flutter at any friction. */
  caliperDegrees: [0, 61, 118, 182, 241, 297],
  padHalfWidthDegrees: 5,
} as const;

export const PADS_PER_CALIPER = 2;
/** Smallest model: below it a gap between calipers is hardly three elements long. */
const FEWEST_DOFS = 300;
const DOFS_PER_NODE = 3;
/**
 * Width over length of an element. The waves nearest to flutter have up to 18 nodal diameters but no nodal circle:
 * with square elements a model of 1 000 dofs misses the highest of them.
 */
const ELEMENT_ASPECT = 2;
const RADIANS = Math.PI / 180;

/** Contact of the two pads of one caliper: both touch the same nodes, one from each face. */
export interface ContactPatch {
  /** Deflection dofs of the nodes, from 0; the circumferential slope is two further on. */
  readonly deflectionDofs: readonly number[];
  /** Share of the contact stiffness at each node, dimensionless; sums to 1. */
  readonly shares: readonly number[];
}

export interface RingBrakeLayout {
  readonly mesh: PolarMesh;
  /** One patch per caliper. */
  readonly patches: readonly ContactPatch[];
  /** Number of the first circle of the rub band. */
  readonly rubCircle: number;
  /** Spoke at each caliper's middle. */
  readonly caliperSpokes: readonly number[];
}

/** Dofs of the pads: one, the motion normal to the ring, for each. */
export const padDofs: number = PADS_PER_CALIPER * geometry.caliperDegrees.length;

/**
 * The mesh with the fewest spokes that gives at least `dofs` dofs, pads included, with elements
 * of about the same shape; mesh lines run along the edges and the middle of every pad.
 *
 * @throws InputError `input.sample-size` below 300 dofs.
 */
export function ringBrakeLayout(dofs: number): RingBrakeLayout {
  if (!(Number.isInteger(dofs) && dofs >= FEWEST_DOFS)) {
    throw InputError.of(
      "input.sample-size",
      "ring-brake",
      `found ${dofs} dofs, expected a whole number of at least ${FEWEST_DOFS}.`,
      `Ask for ${FEWEST_DOFS} dofs or more.`,
    );
  }
  const nodes = (dofs - padDofs) / DOFS_PER_NODE;
  const { innerRadius, outerRadius, rubRadius } = geometry;
  const width = outerRadius - innerRadius;
  const circumference = Math.PI * (outerRadius + innerRadius);
  const across = Math.max(3, Math.round(Math.sqrt((nodes * width) / (ELEMENT_ASPECT * circumference))));
  // Simpson's rule over a patch wants an even number of elements in both directions.
  const acrossRub = 2 * Math.max(1, Math.round((across * (outerRadius - rubRadius)) / width / 2));
  const acrossInner = across - acrossRub;
  const radii = [
    ...evenly(innerRadius, rubRadius, acrossInner),
    ...evenly(rubRadius, outerRadius, acrossRub),
  ];
  const { angles, caliperSpokes, halfPad } = spokes(Math.ceil(nodes / across));
  const mesh: PolarMesh = {
    radii: Float64Array.from([...radii, outerRadius]),
    angles: Float64Array.from(angles),
    clampedInside: true,
    clampedOutside: false,
  };
  const patches = caliperSpokes.map((middle) => contactPatch(mesh, middle, halfPad, acrossInner));
  return { mesh, patches, rubCircle: acrossInner, caliperSpokes };
}

/** `count` points from `from`, evenly spaced towards `to`, which is left out. */
function evenly(from: number, to: number, count: number): number[] {
  return Array.from({ length: count }, (_, i) => from + ((to - from) * i) / count);
}

/** Spoke angles [rad] from the middle of the first caliper on; the gaps share what the pads leave over. */
function spokes(count: number): { angles: number[]; caliperSpokes: number[]; halfPad: number } {
  const { caliperDegrees, padHalfWidthDegrees } = geometry;
  const halfPad = Math.max(1, Math.round((count * padHalfWidthDegrees) / 360));
  const gapWidths = caliperDegrees.map((at, i) => {
    const next = caliperDegrees[i + 1] ?? 360;
    return next - at - 2 * padHalfWidthDegrees;
  });
  const inGaps = share(gapWidths, Math.max(gapWidths.length, count - 2 * halfPad * caliperDegrees.length));
  const angles: number[] = [];
  const caliperSpokes: number[] = [];
  caliperDegrees.forEach((at, i) => {
    caliperSpokes.push(angles.length);
    const edge = at + padHalfWidthDegrees;
    const nextEdge = edge + gapWidths[i];
    angles.push(
      ...evenly(at, edge, halfPad),
      ...evenly(edge, nextEdge, inGaps[i]),
      ...evenly(nextEdge, nextEdge + padHalfWidthDegrees, halfPad),
    );
  });
  return { angles: angles.map((degrees) => degrees * RADIANS), caliperSpokes, halfPad };
}

/** Shares `count` parts among intervals, one at least to each, always to the one with the longest parts. */
function share(widths: readonly number[], count: number): number[] {
  const parts = widths.map(() => 1);
  for (let given = widths.length; given < count; given++) {
    let longest = 0;
    for (let i = 1; i < widths.length; i++) {
      if (widths[i] / parts[i] > widths[longest] / parts[longest]) longest = i;
    }
    parts[longest]++;
  }
  return parts;
}

/** Even pressure over the patch by Simpson's rule: force and moments are then right on the coarsest mesh too. */
function contactPatch(mesh: PolarMesh, middle: number, halfPad: number, rubCircle: number): ContactPatch {
  const spokeCount = mesh.angles.length;
  const last = mesh.radii.length - 1;
  const deflectionDofs: number[] = [];
  const weights: number[] = [];
  for (let i = 0; i <= 2 * halfPad; i++) {
    const spoke = (middle - halfPad + i + spokeCount) % spokeCount;
    for (let circle = rubCircle; circle <= last; circle++) {
      deflectionDofs.push(nodeDof(mesh, circle, spoke));
      weights.push(
        simpson(i, 2 * halfPad) * simpson(circle - rubCircle, last - rubCircle) * mesh.radii[circle],
      );
    }
  }
  const total = weights.reduce((sum, weight) => sum + weight, 0);
  return { deflectionDofs, shares: weights.map((weight) => weight / total) };
}

/** Weight of point i of `intervals` + 1 in the composite Simpson rule, up to a common factor. */
function simpson(i: number, intervals: number): number {
  if (i === 0 || i === intervals) return 1;
  return i % 2 === 1 ? 4 : 2;
}
