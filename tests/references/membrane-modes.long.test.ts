import { expect, it } from "vitest";
import { createRandom } from "../../src/numerics/random.js";
import { analyse } from "../../src/numerics/sparse/analysis.js";
import { shiftInvertLanczos } from "../../src/numerics/sparse/lanczos.js";
import { fromTriplets } from "../../src/numerics/sparse/sparse-matrix.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";

/** A square membrane on s×s grid points: K the five-point difference operator, M the identity. */
function membrane(side: number) {
  const row: number[] = [];
  const col: number[] = [];
  const value: number[] = [];
  const enter = (i: number, j: number, v: number) => {
    row.push(i);
    col.push(j);
    value.push(v);
  };
  for (let k = 0; k < side * side; k++) {
    enter(k, k, 4);
    for (const other of [k % side > 0 ? k - 1 : -1, k >= side ? k - side : -1]) {
      if (other < 0) continue;
      enter(k, other, -1);
      enter(other, k, -1);
    }
  }
  return fromTriplets(side * side, side * side, row, col, value);
}

/** Source: textbook eigenvalues of the difference operator, 4 − 2cos(kπ/(s+1)) − 2cos(lπ/(s+1)); k ≠ l come in pairs. */
function exactValues(side: number, count: number): number[] {
  const part = (k: number) => 4 * Math.sin((k * Math.PI) / (2 * (side + 1))) ** 2;
  const all: number[] = [];
  for (let k = 1; k <= 30; k++) for (let l = 1; l <= 30; l++) all.push(part(k) + part(l));
  return all.sort((a, b) => a - b).slice(0, count);
}

it("the 100 lowest modes of a membrane with 99 856 dofs are found, every pair of equal ones complete", () => {
  const side = 316;
  const stiffness = membrane(side);
  const analysis = analyse(stiffness);
  const exact = exactValues(side, 101);
  const upper = (exact[99]! + exact[100]!) / 2;
  const shifted = stiffness.values.slice();
  for (let j = 0; j < stiffness.cols; j++) {
    for (let p = stiffness.colStart[j]!; p < stiffness.colStart[j + 1]!; p++) {
      if (stiffness.rowIndex[p] === j) shifted[p]! -= upper;
    }
  }
  const { inertia, inertiaReliable } = factorSymmetric(analysis, stiffness, shifted);
  expect(inertiaReliable).toBe(true);
  expect(inertia.negative).toBe(100);
  const factor = factorSymmetric(analysis, stiffness, stiffness.values);
  const found = shiftInvertLanczos(
    {
      order: stiffness.rows,
      shift: 0,
      applyMassInto: (y, x) => y.set(x),
      solveInPlace: (b) => void factor.solveInPlace(b),
    },
    {
      lower: 0,
      upper,
      expected: inertia.negative,
      blockSize: 4,
      tolerance: 1e-9,
      maximumSolves: 2000,
      random: createRandom(5),
    },
  );
  console.log(`${found.solves} solves`);
  expect(found.status).toBe("complete");
  expect(found.values.length).toBe(100);
  // A relative residual of 1e-9 gives values to its square; rounding of the solve leaves eps ‖K‖ / λ₁ < 1e-11.
  found.values.forEach((value, k) => {
    expect(Math.abs(value / exact[k]! - 1)).toBeLessThan(1e-9);
  });
});
