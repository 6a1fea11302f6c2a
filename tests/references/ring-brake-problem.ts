import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import type { SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";
import { writeMatrixMarket } from "../../src/problem/matrix-market-writer.js";
import type { Problem, Triplets } from "../../src/problem/problem.js";
import { readProblem } from "../../src/problem/read-problem.js";
import { ringBrake } from "../../src/structures/ring-brake.js";

/** The ring brake of at least so many dofs, by way of its files. */
export async function ringBrakeProblem(dofs: number): Promise<Problem> {
  const folder = mkdtempSync(join(tmpdir(), "dampwright-ring-brake-"));
  try {
    const { problem, matrices } = ringBrake(dofs);
    for (const [file, { matrix, symmetry }] of matrices)
      await writeMatrixMarket(join(folder, file), tripletsOf(matrix), symmetry);
    writeFileSync(join(folder, "ring-brake.json"), JSON.stringify(problem));
    return await readProblem(join(folder, "ring-brake.json"));
  } finally {
    rmSync(folder, { recursive: true });
  }
}

/** A design near the tuned one: stable over the whole envelope. */
export const stableDesign: ReadonlyMap<string, number> = new Map([
  ["bushOdd", 650],
  ["bushEven", 1400],
  ["layerA", 0.006],
  ["layerC", 0.002],
]);

function tripletsOf({ rows, cols, colStart, rowIndex, values }: SparseMatrix): Triplets {
  const col = new Int32Array(values.length);
  for (let j = 0; j < cols; j++) col.fill(j, colStart[j], colStart[j + 1]);
  return { rows, cols, row: rowIndex, col, value: values };
}
