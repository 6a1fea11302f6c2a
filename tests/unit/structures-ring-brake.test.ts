import { mkdtemp, rm, writeFile } from "node:fs/promises";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, expect, it } from "vitest";
import { eigenvalues } from "../../src/numerics/dense/eigen.js";
import { column, zeros } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { shiftInvertLanczos } from "../../src/numerics/sparse/lanczos.js";
import { fromTriplets, multiplyAddInto, type SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";
import { writeMatrixMarket } from "../../src/problem/matrix-market-writer.js";
import type { Problem, TermGroup } from "../../src/problem/problem.js";
import { readProblem } from "../../src/problem/read-problem.js";
import { ringBrake } from "../../src/structures/ring-brake.js";
import { ringBrakeLayout } from "../../src/structures/ring-brake-layout.js";
import type { SampleModel } from "../../src/structures/sample-model.js";
import { samples } from "../../src/structures/samples.js";

const folder = await mkdtemp(join(tmpdir(), "dampwright-samples-"));
afterAll(() => rm(folder, { recursive: true }));

function tripletsOf(a: SparseMatrix) {
  const col = new Int32Array(a.rowIndex.length);
  for (let j = 0; j < a.cols; j++) col.fill(j, a.colStart[j], a.colStart[j + 1]);
  return { rows: a.rows, cols: a.cols, row: a.rowIndex, col, value: a.values };
}

async function written(model: SampleModel): Promise<Problem> {
  for (const [file, { matrix, symmetry }] of model.matrices) {
    await writeMatrixMarket(join(folder, file), tripletsOf(matrix), symmetry);
  }
  const path = join(folder, `${model.name}.json`);
  await writeFile(path, JSON.stringify(model.problem));
  return readProblem(path);
}

function apply(model: SampleModel, file: string, x: Float64Array): Float64Array {
  const { matrix } = model.matrices.get(file)!;
  const y = new Float64Array(matrix.rows);
  multiplyAddInto(y, 1, matrix, x);
  return y;
}

it.each([...samples.keys()])("the sample %s is a sound problem file", async (name) => {
  const { build, defaultDofs } = samples.get(name)!;
  const problem = await written(build(defaultDofs));
  expect(problem.dofs).toBeGreaterThanOrEqual(defaultDofs);
  expect(problem.notes).not.toBeNull();
});

it("the ring brake says that the viscous equivalent of its layers' loss holds up to its own frequency", async () => {
  const { constants, terms } = await written(ringBrake(300));
  const limited = terms.filter(({ validToHz }) => validToHz !== null);
  expect(limited.map(({ name }) => name)).toEqual(["loss of layerA", "loss of layerB", "loss of layerC"]);
  expect(limited.every(({ validToHz }) => validToHz === constants.get("lossHz"))).toBe(true);
});

it("the ring brake has the dofs asked for and at most a tenth more", () => {
  for (const dofs of [300, 301, 500, 1000, 1234, 3000, 10_000, 30_000]) {
    const { mesh } = ringBrakeLayout(dofs);
    const built = 3 * (mesh.radii.length - 1) * mesh.angles.length + 12;
    expect(built).toBeGreaterThanOrEqual(dofs);
    expect(built).toBeLessThanOrEqual(1.1 * dofs);
    expect([...mesh.angles].every((angle, j) => j === 0 || angle > mesh.angles[j - 1]!)).toBe(true);
  }
  expect(() => ringBrakeLayout(299)).toThrowError(expect.objectContaining({ code: "input.sample-size" }));
});

it("every mesh spreads a pad evenly: its shares have the moments of an even pressure", () => {
  for (const dofs of [300, 1000, 10_000]) {
    const { mesh, patches, caliperSpokes } = ringBrakeLayout(dofs);
    const perSpoke = 3 * (mesh.radii.length - 1);
    patches.forEach(({ deflectionDofs, shares }, caliper) => {
      let [total, radius, angle, square] = [0, 0, 0, 0];
      deflectionDofs.forEach((dof, i) => {
        const spoke = Math.floor(dof / perSpoke);
        const turn = 2 * Math.PI;
        const from = mesh.angles[spoke]! - mesh.angles[caliperSpokes[caliper]!]!;
        const degrees = ((from - turn * Math.round(from / turn)) * 180) / Math.PI;
        total += shares[i]!;
        radius += shares[i]! * mesh.radii[1 + (dof % perSpoke) / 3]!;
        angle += shares[i]! * degrees;
        square += shares[i]! * degrees ** 2;
      });
      expect(total).toBeCloseTo(1, 12);
      expect(radius).toBeCloseTo((2 * (1.3 ** 3 - 1.06 ** 3)) / (3 * (1.3 ** 2 - 1.06 ** 2)), 10);
      expect(angle).toBeCloseTo(0, 10);
      expect(square).toBeCloseTo(25 / 3, 10);
    });
  }
});

it("raising ring and pads together strains no contact and changes no friction", () => {
  const model = ringBrake(500);
  const order = model.matrices.get("contact.mtx")!.matrix.cols;
  const plate = order - 12;
  const lift = Float64Array.from({ length: order }, (_, dof) => (dof >= plate || dof % 3 === 0 ? 1 : 0));
  for (const file of ["contact.mtx", "rub.mtx", "pad-loads.mtx"]) {
    for (const force of apply(model, file, lift)) expect(Math.abs(force)).toBeLessThan(1e-14);
  }
});

it("raising the ring against both pads makes frictional moments that add, the same through the declared error", () => {
  const model = ringBrake(500);
  const order = model.matrices.get("rub.mtx")!.matrix.cols;
  const plate = order - 12;
  const lift = Float64Array.from({ length: order }, (_, dof) => (dof < plate && dof % 3 === 0 ? 1 : 0));
  const moments = apply(model, "rub.mtx", lift);
  // A tilt about the radial axis turns every slope: the six calipers give 2 × share each, on the left-hand side.
  expect(moments.reduce((sum, moment) => sum + moment, 0)).toBeCloseTo(-12, 12);
  const loads = apply(model, "pad-loads.mtx", lift);
  for (const load of loads) expect(load).toBeCloseTo(1, 12);
  const declared = apply(model, "pad-moments.mtx", loads);
  declared.forEach((moment, dof) => {
    expect(moment).toBeCloseTo(moments[dof]!, 14);
  });
});

it("the layers cover the ring inside the rub band once, and their area is the constant of the mass budget", () => {
  const model = ringBrake(3000);
  const constants = model.problem.constants!;
  const areas = ["A", "B", "C"].map((segment) => constants[`area${segment}`]!);
  expect(areas.reduce((sum, area) => sum + area)).toBeCloseTo(Math.PI * (1.06 ** 2 - 0.9 ** 2), 12);
  const { mesh } = ringBrakeLayout(3000);
  const order = 3 * (mesh.radii.length - 1) * mesh.angles.length;
  // w = (r − 0.9)² keeps to the clamp, so the dofs of the inner edge are not missed.
  const bowl = Float64Array.from({ length: order + 12 }, (_, dof) => {
    const radius = mesh.radii[1 + (Math.floor(dof / 3) % (mesh.radii.length - 1))]!;
    return dof >= order ? 0 : [(radius - 0.9) ** 2, 2 * (radius - 0.9), 0][dof % 3]!;
  });
  // ∫ (r − 0.9)⁴ r dr over the band, with s = r − 0.9.
  const band = 1.06 - 0.9;
  const exact = band ** 6 / 6 + (0.9 * band ** 5) / 5;
  ["A", "B", "C"].forEach((segment, s) => {
    const y = apply(model, `layer-area-${segment}.mtx`, bowl);
    const found = y.reduce((sum, yi, i) => sum + yi * bowl[i]!, 0);
    const share = areas[s]! / (Math.PI * (1.06 ** 2 - 0.9 ** 2));
    // Straight chords lie inside the circles: 1 % here, where a sector left out or counted twice gives 50 %.
    expect(Math.abs(found / (2 * Math.PI * share * exact) - 1)).toBeLessThan(0.02);
  });
});

/** One of the model's matrices at given values, on a pattern with full diagonal. */
function assembled(problem: Problem, group: TermGroup, values: ReadonlyMap<string, number>): SparseMatrix {
  const diagonal = Array.from({ length: problem.dofs }, (_, i) => i);
  const [rows, cols, entries] = [[...diagonal], [...diagonal], diagonal.map(() => 0)];
  for (const term of problem.terms.filter((each) => each.group === group)) {
    const factor = term.factor.evaluate(values);
    const { row, col, value } = problem.matrices.get(term.matrix)!.triplets;
    value.forEach((entry, t) => {
      rows.push(row[t]!);
      cols.push(col[t]!);
      entries.push(factor * entry);
    });
  }
  return fromTriplets(problem.dofs, problem.dofs, rows, cols, entries);
}

/** Eigenvalues with Im s > 0 of the start design, on its real modes up to 1200 Hz: enough to tell flutter near 390 Hz. */
function poles(problem: Problem, friction: number, pressure: number): { hz: number; growth: number }[] {
  const values = new Map([
    ...problem.constants,
    ...problem.design.map(({ name, start }): [string, number] => [name, start]),
    ["friction", friction],
    ["pressure", pressure],
  ]);
  const mass = assembled(problem, "mass", values);
  const stiffness = assembled(problem, "stiffness", values);
  const upper = (2 * Math.PI * 1200) ** 2;
  const pencil = (mu: number) => {
    const { rows, cols, rowIndex, values: k } = stiffness;
    const t = tripletsOf(mass);
    const col = tripletsOf(stiffness).col;
    const scaledMass = [...t.value].map((entry) => -mu * entry);
    return fromTriplets(rows, cols, [...rowIndex, ...t.row], [...col, ...t.col], [...k, ...scaledMass]);
  };
  const factorAt = (mu: number) => {
    const matrix = pencil(mu);
    return factorSymmetric(analyse(matrix), matrix, matrix.values);
  };
  const factor = factorAt(0);
  const product = (a: SparseMatrix, x: Float64Array): Float64Array => {
    const y = new Float64Array(a.rows);
    multiplyAddInto(y, 1, a, x);
    return y;
  };
  const {
    status,
    values: squares,
    vectors,
  } = shiftInvertLanczos(
    {
      order: problem.dofs,
      shift: 0,
      applyMassInto: (y, x) => y.set(product(mass, x)),
      solveInPlace: (b) => factor.solveInPlace(b),
    },
    {
      lower: 0,
      upper,
      expected: factorAt(upper).inertia.negative,
      blockSize: 2,
      tolerance: 1e-8,
      maximumSolves: 600,
      random: createRandom(1),
    },
  );
  expect(status).toBe("complete");
  const damping = assembled(problem, "damping", values);
  const rubbing = assembled(problem, "circulatory", values);
  const modes = squares.length;
  const first = zeros(2 * modes, 2 * modes);
  const at = (i: number, j: number) => i + 2 * modes * j;
  for (let j = 0; j < modes; j++) {
    const damped = product(damping, column(vectors, j));
    const rubbed = product(rubbing, column(vectors, j));
    first.values[at(j, modes + j)] = 1;
    for (let i = 0; i < modes; i++) {
      const dot = (y: Float64Array) =>
        y.reduce((sum, yk, k) => sum + yk * vectors.values[k + i * problem.dofs]!, 0);
      first.values[at(modes + i, j)] = -dot(rubbed) - (i === j ? squares[i]! : 0);
      first.values[at(modes + i, modes + j)] = -dot(damped);
    }
  }
  const { re, im } = eigenvalues(first);
  return [...im].map((w, i) => ({ hz: w / (2 * Math.PI), growth: re[i]! })).filter(({ hz }) => hz > 0);
}

it("the start design flutters near 390 Hz in one part of the envelope and is stable in another", async () => {
  const problem = await written(ringBrake(1000));
  const unstable = poles(problem, 0.55, 0.75).filter(({ growth }) => growth > 0);
  expect(unstable.map(({ hz }) => Math.round(hz / 10))).toEqual([39]);
  expect(poles(problem, 0.25, 1.5).every(({ growth }) => growth < 0)).toBe(true);
});
