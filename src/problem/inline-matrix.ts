import type { FaultList } from "./fault-list.js";
import type { Triplets } from "./problem.js";
import type * as file from "./problem-file.js";

/** Most entries that a product of columns may have when it is multiplied out. */
const mostProductEntries = 2e7;

/** A list of [dof, value], dofs from 1; several of them are the columns of a matrix. */
export type VectorList = readonly (readonly (readonly [number, number])[])[];

/** The columns (n×m) written in the file; null after adding a fault for each dof above n. */
export function columnsOf(
  vectors: VectorList,
  n: number,
  at: (k: number) => string,
  faults: FaultList,
): Triplets | null {
  const found = faults.count;
  vectors.forEach((vector, k) => {
    vector.forEach(([dof], t) => {
      checkDof(dof, n, `${at(k)}/${t}/0`, faults);
    });
  });
  if (faults.count > found) return null;
  return {
    rows: n,
    cols: vectors.length,
    row: Int32Array.from(vectors.flatMap((vector) => vector.map(([dof]) => dof - 1))),
    col: Int32Array.from(vectors.flatMap((vector, k) => vector.map(() => k))),
    value: Float64Array.from(vectors.flatMap((vector) => vector.map(([, value]) => value))),
  };
}

/** A dof of the file must be 0 (where ground is allowed) to n. */
export function checkDof(dof: number, n: number, at: string, faults: FaultList): void {
  if (dof <= n) return;
  faults.add("input.dof-range", at, `dof ${dof} does not exist, the model has ${n}`, "Dofs count from 1.");
}

/** A matrix by entries; its own sizes, where not given, are n. */
export function fromEntries(
  m: file.EntriesMatrix,
  n: number | null,
  at: string,
  faults: FaultList,
): Triplets | null {
  const rows = m.rows ?? n;
  const cols = m.cols ?? n;
  if (rows === null || cols === null) return null;
  const found = faults.count;
  m.entries.forEach(([i, j], t) => {
    if (i <= rows && j <= cols) return;
    const message = `entry (${i}, ${j}) lies outside the ${rows} × ${cols} matrix`;
    faults.add("input.dof-range", `${at}/entries/${t}`, message, "Correct the entry, or give rows and cols.");
  });
  if (faults.count > found) return null;
  return {
    rows,
    cols,
    row: Int32Array.from(m.entries, ([i]) => i - 1),
    col: Int32Array.from(m.entries, ([, j]) => j - 1),
    value: Float64Array.from(m.entries, ([, , value]) => value),
  };
}

/** Σ rate·(eᵢ − eⱼ)(eᵢ − eⱼ)ᵀ, with e₀ = 0 for the ground. */
export function fromLinks(m: file.LinksMatrix, n: number, at: string, faults: FaultList): Triplets | null {
  const found = faults.count;
  const entries = m.links.flatMap(([i, j, rate], t) => {
    checkDof(i, n, `${at}/links/${t}/0`, faults);
    checkDof(j, n, `${at}/links/${t}/1`, faults);
    if (i === j) {
      const message = `the link joins ${i === 0 ? "the ground" : `dof ${i}`} to itself`;
      faults.add(
        "input.link",
        `${at}/links/${t}`,
        message,
        "Give two different dofs, or one and 0 for the ground.",
      );
    }
    const all = [
      [i, i, rate],
      [j, j, rate],
      [i, j, -rate],
      [j, i, -rate],
    ] as const;
    return all.filter(([a, b]) => a > 0 && b > 0);
  });
  if (faults.count > found) return null;
  return {
    rows: n,
    cols: n,
    row: Int32Array.from(entries, ([i]) => i - 1),
    col: Int32Array.from(entries, ([, j]) => j - 1),
    value: Float64Array.from(entries, ([, , value]) => value),
  };
}

/** The two factors of an outer product and left·rightᵀ multiplied out. */
export function fromOuter(
  { outer }: file.OuterMatrix,
  n: number,
  at: string,
  faults: FaultList,
): { readonly left: Triplets; readonly right: Triplets; readonly triplets: Triplets } | null {
  const left = sideColumns(outer.left, n, `${at}/outer/left`, faults);
  const right = sideColumns(outer.right, n, `${at}/outer/right`, faults);
  if (left === null || right === null) return null;
  if (left.cols !== right.cols) {
    const message = `left has ${left.cols} columns, right ${right.cols}; expected equally many`;
    faults.add("input.matrix-shape", `${at}/outer`, message, "Give one column of right for each of left.");
    return null;
  }
  const triplets = product(left, right);
  if (triplets !== null) return { left, right, triplets };
  const message = `the product would have more than ${mostProductEntries} entries`;
  faults.add("input.matrix-size", `${at}/outer`, message, "Use vectors with fewer dofs, or fewer columns.");
  return null;
}

function sideColumns(side: file.Side, n: number, at: string, faults: FaultList): Triplets | null {
  if ("columns" in side) return columnsOf(side.columns, n, (k) => `${at}/columns/${k}`, faults);
  return columnsOf([side], n, () => at, faults);
}

/** left·rightᵀ of two n×m matrices whose entries stand column by column; null above the limit of entries. */
function product(left: Triplets, right: Triplets): Triplets | null {
  const leftCount = countByColumn(left);
  const rightCount = countByColumn(right);
  const total = leftCount.reduce((sum, count, k) => sum + count * rightCount[k], 0);
  if (total > mostProductEntries) return null;
  const out = { row: new Int32Array(total), col: new Int32Array(total), value: new Float64Array(total) };
  let end = 0;
  let p = 0;
  let q = 0;
  for (let k = 0; k < left.cols; k++) {
    for (let s = p; s < p + leftCount[k]; s++) {
      for (let t = q; t < q + rightCount[k]; t++) {
        out.row[end] = left.row[s];
        out.col[end] = right.row[t];
        out.value[end++] = left.value[s] * right.value[t];
      }
    }
    p += leftCount[k];
    q += rightCount[k];
  }
  return { rows: left.rows, cols: right.rows, ...out };
}

function countByColumn({ cols, col }: Triplets): number[] {
  const count = new Array<number>(cols).fill(0);
  for (const j of col) count[j]++;
  return count;
}
