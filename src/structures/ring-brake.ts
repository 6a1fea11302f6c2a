/**
 * The azimuth ring brake of a radio telescope (an invented machine): a steel ring clamped at its inner edge
 * and gripped by six calipers that hold the dish at its stow azimuth while wind drags the ring through the pads.
 */

import { fromTriplets, type SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { Entry, Link, Matrix, ProblemFile, Term } from "../problem/problem-file.js";
import { everyElement, type PlateMatrices, plateMatrices } from "./annular-plate.js";
import {
  geometry,
  PADS_PER_CALIPER,
  padDofs,
  type RingBrakeLayout,
  ringBrakeLayout,
} from "./ring-brake-layout.js";
import type { SampleMatrix, SampleModel } from "./sample-model.js";

/** Ring material [N/m², kg/m³] and thickness [m]. */
const steel = { modulus: 2.1e11, poisson: 0.3, density: 7850, thickness: 0.028 };

/** Free layers: the sectors between the calipers' middles, in opposite pairs, inside the rub band. */
const SEGMENTS: readonly string[] = ["A", "B", "C"];

const LAYER_LAW = (layer: string): string => `(h^2*${layer}/4 + h*${layer}^2/2 + ${layer}^3/3)`;

const NOTES = `Azimuth ring brake of a radio telescope, an invented machine. A steel ring, radii 0.9 and 1.3 m, 28 mm thick, clamped at its inner edge, is gripped by six calipers at 0, 61, 118, 182, 241 and 297 degrees. Unequal spacing matters: equal spacing leaves double modes that flutter at any friction.
Each caliper has two pads, one a face, +-5 degrees over the outer 60 % of the width: a mass on a contact spring spread over the nodes it touches, and on a bush with a dashpot to the caliper, which stands still.
Friction acts at the faces, half the thickness from the mid-plane. Where the ring rises by w, the upper pad is pressed more and the lower one less; the two changes of friction point opposite ways on opposite faces, so their moments about the radial axis add: h/2 * friction * contact * (2w - upper - lower) at each node. That is the circulatory term "rub". Not modelled: motion of the ring in its plane, friction that changes with speed, the turning of the steady friction force with the slope.
Free layers stick to one face inside the rub band, in three pairs of opposite sectors (A: after calipers 1 and 4, B: 2 and 5, C: 3 and 6). Fixed-plane law: the plate's mid-plane is taken as neutral, which overstates loss slightly (Oberst and Frankenfeld 1952 give the exact law). The loss is a viscous equivalent, right at lossHz only: above it the model damps too much, below it too little; results warn where the answer lies above it (validToHz). lossHz lies at the upper end of the modes that come close to flutter.
Background damping: the ring's structural loss as stiffness-proportional damping with ratio backgroundRatio at backgroundHz.
Declared error: the friction coefficient under each pad is off by frictionError, one channel a pad; ||Delta|| = 1 is that error at all twelve pads, in whatever phase.
What it teaches: two dangers. Near 390 Hz the pads on their bushes meet the ring's wave with 8 nodal diameters at low and middle pressure: flutter at the start, and only dashpots help. At 1.4 to 1.6 kHz waves with 17 and 18 nodal diameters come close to flutter at high pressure, and only layers help. The budget pays for some of each.
Dofs: three a node (w, dw/dr, dw/(r dtheta)), spoke by spoke from the inside out, then the twelve pads, upper and lower of each caliper.`;

/**
 * The ring brake with at least `dofs` dofs and as few more as the mesh allows.
 *
 * @throws InputError `input.sample-size` when `dofs` is too small for the geometry.
 */
export function ringBrake(dofs: number): SampleModel {
  const layout = ringBrakeLayout(dofs);
  const matrices = ringBrakeMatrices(layout);
  return { name: "ring-brake", problem: ringBrakeProblem(layout, matrices), matrices };
}

function ringBrakeMatrices(layout: RingBrakeLayout): Map<string, SampleMatrix> {
  const { mesh, rubCircle } = layout;
  const ring = plateMatrices(mesh, steel.poisson, everyElement);
  const plateRigidity = (steel.modulus * steel.thickness ** 3) / 12;
  const symmetric = (matrix: SparseMatrix): SampleMatrix => ({ matrix, symmetry: "symmetric" });
  const general = (matrix: SparseMatrix): SampleMatrix => ({ matrix, symmetry: "general" });
  const matrices = new Map<string, SampleMatrix>([
    ["ring-mass.mtx", symmetric(withPads(ringMass(ring)))],
    ["ring-stiffness.mtx", symmetric(withPads(scaled(ring.bending, plateRigidity)))],
    ["contact.mtx", symmetric(contact(layout))],
    ["rub.mtx", general(rub(layout))],
    ["pad-moments.mtx", general(padMoments(layout))],
    ["pad-loads.mtx", general(padLoads(layout))],
  ]);
  SEGMENTS.forEach((segment, s) => {
    const patch = plateMatrices(
      mesh,
      steel.poisson,
      (circle, spoke) => circle < rubCircle && gapOf(layout, spoke) % SEGMENTS.length === s,
    );
    matrices.set(`layer-bending-${segment}.mtx`, symmetric(withPads(patch.bending)));
    matrices.set(`layer-area-${segment}.mtx`, symmetric(withPads(patch.area)));
  });
  return matrices;
}

/** Number of the gap, counted by the caliper at whose middle it begins, in which the element after a spoke lies. */
function gapOf({ caliperSpokes }: RingBrakeLayout, spoke: number): number {
  return caliperSpokes.filter((middle) => middle <= spoke).length - 1;
}

/** Mass of the ring with its rotary inertia. */
function ringMass({ area, rotary }: PlateMatrices): SparseMatrix {
  const { density, thickness } = steel;
  return {
    ...area,
    values: area.values.map(
      (entry, p) => density * thickness * entry + ((density * thickness ** 3) / 12) * rotary.values[p],
    ),
  };
}

function scaled(a: SparseMatrix, factor: number): SparseMatrix {
  return { ...a, values: a.values.map((entry) => factor * entry) };
}

/** The same matrix with empty rows and columns for the pads at its end. */
function withPads(a: SparseMatrix): SparseMatrix {
  const colStart = new Int32Array(a.cols + padDofs + 1).fill(a.rowIndex.length);
  colStart.set(a.colStart);
  return { ...a, rows: a.rows + padDofs, cols: a.cols + padDofs, colStart };
}

/** Calls `visit` for every pad at every node it touches; `pad` counts the pads, upper and lower of each caliper. */
function visitContacts(
  { patches }: RingBrakeLayout,
  visit: (pad: number, deflectionDof: number, share: number) => void,
): void {
  patches.forEach(({ deflectionDofs, shares }, caliper) => {
    for (let face = 0; face < PADS_PER_CALIPER; face++) {
      deflectionDofs.forEach((dof, i) => {
        visit(PADS_PER_CALIPER * caliper + face, dof, shares[i]);
      });
    }
  });
}

/** Dofs without the pads, which come after. */
function plateOrder({ mesh }: RingBrakeLayout): number {
  return 3 * (mesh.radii.length - 1) * mesh.angles.length;
}

/** Gathers coordinates of a matrix. */
class Gathered {
  private readonly rows: number[] = [];
  private readonly cols: number[] = [];
  private readonly entries: number[] = [];

  add(row: number, col: number, entry: number): void {
    this.rows.push(row);
    this.cols.push(col);
    this.entries.push(entry);
  }

  matrix(rows: number, cols: number): SparseMatrix {
    return fromTriplets(rows, cols, this.rows, this.cols, this.entries);
  }
}

/** Contact springs, 1 N/m a pad: Σ share (w − pad)(w − pad)ᵀ. */
function contact(layout: RingBrakeLayout): SparseMatrix {
  const order = plateOrder(layout);
  const springs = new Gathered();
  visitContacts(layout, (pad, w, share) => {
    springs.add(w, w, share);
    springs.add(order + pad, order + pad, share);
    springs.add(w, order + pad, -share);
    springs.add(order + pad, w, -share);
  });
  return springs.matrix(order + padDofs, order + padDofs);
}

/**
 * Friction for μ (contact stiffness) h/2 = 1, on the left-hand side of the equation of motion.
 *
 * The ring slides towards +θ; u_θ = −z φ at height z, φ = ∂w/(r∂θ). A pad on the upper face (z = h/2) presses with
 * k (w − pad) more and drags with −μ k (w − pad): its work on δφ is +μ k (h/2)(w − pad). A pad on the lower face is
 * pressed less, so its drag changes the other way, at the other lever: the same +μ k (h/2)(w − pad) again.
 */
function rub(layout: RingBrakeLayout): SparseMatrix {
  const order = plateOrder(layout);
  const friction = new Gathered();
  visitContacts(layout, (pad, w, share) => {
    friction.add(w + 2, w, -share);
    friction.add(w + 2, order + pad, share);
  });
  return friction.matrix(order + padDofs, order + padDofs);
}

/** B of the friction error: column p is the moment that friction under pad p spreads over its nodes. */
function padMoments(layout: RingBrakeLayout): SparseMatrix {
  const moments = new Gathered();
  visitContacts(layout, (pad, w, share) => moments.add(w + 2, pad, -share));
  return moments.matrix(plateOrder(layout) + padDofs, padDofs);
}

/** C of the friction error: row p is the mean approach of ring and pad p, which sets the change of its load. */
function padLoads(layout: RingBrakeLayout): SparseMatrix {
  const order = plateOrder(layout);
  const loads = new Gathered();
  visitContacts(layout, (pad, w, share) => {
    loads.add(pad, w, share);
    loads.add(pad, order + pad, -share);
  });
  return loads.matrix(padDofs, order + padDofs);
}

function ringBrakeProblem(layout: RingBrakeLayout, files: ReadonlyMap<string, SampleMatrix>): ProblemFile {
  const byName = [...files.keys()].map((file): [string, Matrix] => [matrixName(file), { file }]);
  const bushes = { range: [50, 3000] as [number, number], start: 60, unit: "N s/m" };
  const layer = { range: [0, 0.006] as [number, number], start: 0, unit: "m" };
  return {
    format: "dampwright/1",
    title: "Azimuth ring brake of a radio telescope",
    notes: NOTES,
    matrices: { ...Object.fromEntries(byName), ...padMatrices(plateOrder(layout)) },
    constants: constants(),
    envelope: {
      friction: { range: [0.25, 0.55], nominal: 0.4 },
      pressure: { range: [0.5, 1.5], nominal: 1 },
    },
    design: { bushOdd: bushes, bushEven: bushes, layerA: layer, layerB: layer, layerC: layer },
    terms: terms(),
    perturbations: [
      {
        name: "friction under each pad",
        acts: "stiffness",
        kind: "complex",
        size: "frictionError*pressure*contactRate*h/2",
        left: "padMoments",
        right: "padLoads",
      },
    ],
    margin: { measure: "radius", bandHz: [50, 2000], target: 1 },
    budget: budget(),
    tune: { seed: 1, tolerance: 0.001 },
  };
}

/** `layer-area-A.mtx` is called layerAreaA in the problem file. */
function matrixName(file: string): string {
  return file.replace(/\.mtx$/, "").replace(/-(\w)/g, (_, letter: string) => letter.toUpperCase());
}

/** Masses, bushes and dashpots of the pads; calipers 1, 3, 5 are odd. */
function padMatrices(order: number): Record<string, Matrix> {
  const pads = Array.from({ length: padDofs }, (_, pad) => order + pad + 1);
  const isOdd = (pad: number): boolean => Math.floor(pad / PADS_PER_CALIPER) % 2 === 0;
  const toGround = (dofs: readonly number[]): Matrix => ({ links: dofs.map((dof): Link => [dof, 0, 1]) });
  return {
    pads: { entries: pads.map((dof): Entry => [dof, dof, 1]) },
    bushes: toGround(pads),
    dashpotsOdd: toGround(pads.filter((_, pad) => isOdd(pad))),
    dashpotsEven: toGround(pads.filter((_, pad) => !isOdd(pad))),
  };
}

function constants(): Record<string, number> {
  return {
    h: steel.thickness,
    padMass: 8,
    /** N/m a pad: 5.5e8 in all. */
    contactRate: 5.5e8 / padDofs,
    bushRate: 5e7,
    backgroundRatio: 0.0005,
    backgroundHz: 600,
    modulus: 3e9,
    loss: 0.5,
    lossHz: 1600,
    density: 1500,
    frictionError: 0.15,
    ...Object.fromEntries(SEGMENTS.map((segment, s) => [`area${segment}`, segmentArea(s)])),
  };
}

/** Area of one pair of layer sectors [m²]. */
function segmentArea(segment: number): number {
  const { caliperDegrees, innerRadius, rubRadius } = geometry;
  const degrees = caliperDegrees
    .map((at, gap) => (gap % SEGMENTS.length === segment ? (caliperDegrees[gap + 1] ?? 360) - at : 0))
    .reduce((sum, width) => sum + width, 0);
  return (Math.PI * (rubRadius ** 2 - innerRadius ** 2) * degrees) / 360;
}

function terms(): ProblemFile["terms"] {
  const layers = SEGMENTS.map((segment) => ({
    area: `layerArea${segment}`,
    bending: `layerBending${segment}`,
    thickness: `layer${segment}`,
  }));
  return {
    mass: [
      { matrix: "ringMass" },
      { matrix: "pads", factor: "padMass" },
      ...layers.map(({ area, thickness }): Term => ({ matrix: area, factor: `density*${thickness}` })),
    ],
    damping: [
      { matrix: "ringStiffness", factor: "2*backgroundRatio/(2*pi*backgroundHz)", name: "background" },
      { matrix: "dashpotsOdd", factor: "bushOdd" },
      { matrix: "dashpotsEven", factor: "bushEven" },
      ...layers.map(
        ({ bending, thickness }): Term => ({
          matrix: bending,
          factor: `modulus*loss/(2*pi*lossHz) * ${LAYER_LAW(thickness)}`,
          name: `loss of ${thickness}`,
          validToHz: "lossHz",
        }),
      ),
    ],
    stiffness: [
      { matrix: "ringStiffness" },
      { matrix: "bushes", factor: "bushRate" },
      { matrix: "contact", factor: "pressure*contactRate" },
      ...layers.map(
        ({ bending, thickness }): Term => ({
          matrix: bending,
          factor: `modulus * ${LAYER_LAW(thickness)}`,
          name: `stiffness of ${thickness}`,
        }),
      ),
    ],
    circulatory: [{ matrix: "rub", factor: "friction*pressure*contactRate*h/2" }],
  };
}

function budget(): NonNullable<ProblemFile["budget"]> {
  const mass = SEGMENTS.map((segment) => `area${segment}*layer${segment}`).join(" + ");
  const thickness = SEGMENTS.map((segment) => `layer${segment}`).join(" + ");
  return {
    mass: { formula: `density*(${mass})`, limit: 4, unit: "kg" },
    cost: { formula: `0.08*(bushOdd + bushEven) + 12*(${thickness})/0.001`, limit: 260 },
  };
}
