import { describe, expect, it } from "vitest";
import type { DenseMatrix } from "../../src/numerics/dense/matrix.js";
import { column } from "../../src/numerics/dense/matrix.js";
import { multiply, multiplyTransposed } from "../../src/numerics/dense/products.js";
import { createRandom } from "../../src/numerics/random.js";
import { fromTriplets, type SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";
import { Basis } from "../../src/reduction/basis.js";
import { truncateModes } from "../../src/reduction/modal-truncation.js";
import { projectChannel, projectSquare } from "../../src/reduction/projection.js";
import {
  companionEigenvalues,
  definite,
  denseOf,
  diagonal,
  pencilOf,
  randomRows,
  tripletsOf,
} from "./model-cases.js";

function sparseOf(rows: readonly (readonly number[])[], cols: number = rows.length): SparseMatrix {
  const { row, col, value } = tripletsOf(rows, cols);
  return fromTriplets(rows.length, cols, row, col, value);
}

function largestDifference(a: DenseMatrix, b: DenseMatrix): number {
  expect([a.rows, a.cols]).toEqual([b.rows, b.cols]);
  return a.values.reduce((most, value, q) => Math.max(most, Math.abs(value - b.values[q]!)), 0);
}

describe("a basis", () => {
  it("is orthonormal in its energy, whatever is appended", () => {
    const random = createRandom(3);
    const n = 20;
    const energyRows = definite(random, n, 1).map((row, i) =>
      // Rotations and displacements: scales that differ by 1e6.
      row.map((value, j) => value * (i % 2 === 0 ? 1e3 : 1) * (j % 2 === 0 ? 1e3 : 1)),
    );
    const basis = new Basis(sparseOf(energyRows));
    const vectors = randomRows(random, 9, n).map((row) => Float64Array.from(row));
    // Nearly dependent ones too: what is left of them after projection is all rounding sees.
    vectors.push(vectors[0]!.map((value, i) => value + 1e-7 * vectors[1]![i]! + 1e-7 * (i % 3)));
    expect(basis.append(vectors, 1e-10)).toBe(10);
    const v = basis.matrix;
    const gram = multiplyTransposed(v, multiply(denseOf(energyRows), v));
    // Two passes of Gram–Schmidt: a few eps times √n.
    expect(largestDifference(gram, denseOf(diagonal(new Array(10).fill(1))))).toBeLessThan(1e-13);
  });

  it("keeps vectors of one batch apart, however nearly they depend on each other or on what was there", () => {
    const random = createRandom(7);
    const n = 60;
    const energyRows = definite(random, n, 1);
    const basis = new Basis(sparseOf(energyRows));
    const batch = randomRows(random, 12, n).map((row) => Float64Array.from(row));
    expect(basis.append(batch, 1e-10)).toBe(12);
    // Half known, half new; each differs from the others by 1e-6 of itself, and every third is there twice.
    const fresh = randomRows(random, 1, n)[0]!;
    const common = batch[3]!.map((value, i) => value + fresh[i]!);
    const close = randomRows(random, 20, n).map((row) => common.map((value, i) => value + 1e-6 * row[i]!));
    const twice = close.filter((_, k) => k % 3 === 0);
    expect(basis.append([...close, ...twice], 1e-10)).toBe(20);
    const v = basis.matrix;
    const gram = multiplyTransposed(v, multiply(denseOf(energyRows), v));
    expect(largestDifference(gram, denseOf(diagonal(new Array(32).fill(1))))).toBeLessThan(1e-13);
  });

  it("drops what is not new, zero, or not finite", () => {
    const basis = new Basis(sparseOf(diagonal([1, 4, 9])));
    const unit = Float64Array.of(1, 0, 0);
    expect(
      basis.append([unit, unit, Float64Array.of(0, 0, 0), Float64Array.of(Number.NaN, 0, 0)], 1e-10),
    ).toBe(1);
    // A thousandth of the energy norm is new: kept at 1e-4, dropped at 1e-2.
    const nearly = Float64Array.of(1, 0.0005, 0);
    expect(basis.append([nearly], 1e-2)).toBe(0);
    expect(basis.append([nearly], 1e-4)).toBe(1);
  });

  it("never grows beyond the space", () => {
    const random = createRandom(8);
    const basis = new Basis(sparseOf(diagonal([1, 2])));
    basis.append(
      randomRows(random, 6, 2).map((row) => Float64Array.from(row)),
      1e-12,
    );
    expect(basis.cols).toBe(2);
  });
});

describe("projection", () => {
  const random = createRandom(5);
  const n = 14;
  const general = randomRows(random, n, n);
  const kinds = [
    ["symmetric", 1, general.map((row, i) => row.map((value, j) => value + general[j]![i]!))],
    ["skew", -1, general.map((row, i) => row.map((value, j) => value - general[j]![i]!))],
    ["general", 0, general],
    ["local", 0, general.map((row, i) => row.map((value, j) => (i > 9 && j > 10 ? value : 0)))],
    ["empty", 1, general.map((row) => row.map(() => 0))],
  ] as const;
  const v = denseOf(randomRows(random, n, 7));

  it.each(kinds)("of a %s matrix grows by columns to what it is from scratch", (_, symmetry, rows) => {
    const a = sparseOf(rows);
    const whole = multiplyTransposed(v, multiply(denseOf(rows), v));
    for (const known of [0, 1, 4, 6, 7]) {
      const first = { rows: n, cols: known, values: v.values.subarray(0, n * known) };
      const before = projectSquare(a, symmetry, first, denseOf([], 0), 0);
      const grown = projectSquare(a, symmetry, v, before, known);
      // n² products of numbers of size one.
      expect(largestDifference(grown, whole)).toBeLessThan(1e-12);
    }
  });

  it("of channels is VᵀB", () => {
    const rows = randomRows(random, n, 3);
    const projected = projectChannel(sparseOf(rows, 3), v);
    expect(largestDifference(projected, multiplyTransposed(v, denseOf(rows)))).toBeLessThan(1e-13);
  });
});

describe("the second level of the reduced model", () => {
  const random = createRandom(12);
  const n = 8;
  const given = {
    mass: definite(random, n, 1),
    damping: definite(random, n, 0.02),
    stiffness: diagonal([1, 2, 3, 4, 400, 500, 600, 700]),
    left: randomRows(random, n, 2),
    right: randomRows(random, 2, n),
  };
  const pencil = pencilOf(given);

  it("keeps the real modes below a frequency and no others", () => {
    const kept = truncateModes(pencil, 3);
    expect(kept.order).toBeLessThan(n);
    // Undamped frequencies, by another library, of the same model without damping.
    const undamped = companionEigenvalues(pencilOf({ mass: given.mass, stiffness: given.stiffness }))
      .filter(({ im }) => im > 0)
      .map(({ im }) => im)
      .sort((a, b) => a - b);
    expect(kept.order).toBe(undamped.filter((omega) => omega <= 3).length);
    const own = companionEigenvalues({
      ...kept,
      velocityMatrix: { ...kept.massMatrix, values: new Float64Array(kept.order ** 2) },
    })
      .filter(({ im }) => im > 0)
      .map(({ im }) => im)
      .sort((a, b) => a - b);
    own.forEach((omega, k) => {
      expect(omega).toBeCloseTo(undamped[k]!, 8);
    });
  });

  it("changes nothing but the coordinates when all modes are kept", () => {
    const all = truncateModes(pencil, 1e3);
    expect(all.order).toBe(n);
    const sorted = (list: readonly { re: number; im: number }[]) =>
      [...list].sort((a, b) => a.im - b.im || a.re - b.re).map(({ re, im }) => [re, im]);
    const [before, after] = [sorted(companionEigenvalues(pencil)), sorted(companionEigenvalues(all))];
    before.forEach(([re, im], k) => {
      expect(after[k]![0]).toBeCloseTo(re!, 8);
      expect(after[k]![1]).toBeCloseTo(im!, 8);
    });
  });

  it("returns the model as it is where K + σM is not positive definite or nothing lies below", () => {
    expect(truncateModes(pencilOf({ mass: diagonal([0, 1]), stiffness: diagonal([-1, 1]) }), 2).order).toBe(
      2,
    );
    const stiff = pencilOf({ mass: diagonal([1, 1]), stiffness: diagonal([100, 200]) });
    expect(truncateModes(stiff, 1)).toBe(stiff);
  });

  it("takes a singular mass: massless dofs have no mode below any frequency", () => {
    const kept = truncateModes(pencilOf({ mass: diagonal([1, 0, 1]), stiffness: diagonal([1, 5, 9]) }), 2);
    expect(kept.order).toBe(1);
    expect(column(kept.stiffnessMatrix, 0)[0]! / column(kept.massMatrix, 0)[0]!).toBeCloseTo(1, 12);
  });
});
