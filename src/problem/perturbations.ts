import type { ProblemDocument } from "./document.js";
import type { FaultList } from "./fault-list.js";
import { columnsOf } from "./inline-matrix.js";
import type { Matrices } from "./matrices.js";
import { suggest } from "./nearest.js";
import { type Parameters, readFormula } from "./parameters.js";
import type { Perturbation, Triplets } from "./problem.js";
import type * as file from "./problem-file.js";
import { agree } from "./symmetry.js";
import { transposed } from "./triplets.js";

/** Reads the blocks of model error and checks their sizes against the model and each other. */
export function readPerturbations(
  { content }: ProblemDocument,
  matrices: Matrices,
  parameters: Parameters,
  faults: FaultList,
): Perturbation[] {
  const seen = new Set<string>();
  return (content.perturbations ?? []).flatMap((written, k) => {
    if (written === null) return [];
    const at = `/perturbations/${k}`;
    const name = written.name ?? `perturbation ${k + 1}`;
    if (seen.has(name)) {
      const message = `another perturbation is called "${name}"`;
      faults.add("input.duplicate-name", `${at}/name`, message, "Give each its own name.");
    }
    seen.add(name);
    const size = readFormula(written.size ?? 1, `${at}/size`, parameters, faults);
    const left = readLeft(written.left, `${at}/left`, matrices, faults);
    const right = readRight(written.right, `${at}/right`, matrices, faults);
    if (size === null || left === undefined || right === undefined) return [];
    const found = { name, acts: written.acts, kind: written.kind, size, left, right };
    checkKind(found, at, matrices.dofs, faults);
    return [found];
  });
}

/** B, n×m; null: identity; undefined after a fault, here or in what it refers to. */
function readLeft(
  left: file.Left,
  at: string,
  matrices: Matrices,
  faults: FaultList,
): Triplets | null | undefined {
  if (typeof left !== "string") {
    if (matrices.dofs === null) return undefined;
    if ("columns" in left)
      return columnsOf(left.columns, matrices.dofs, (k) => `${at}/columns/${k}`, faults) ?? undefined;
    return columnsOf([left], matrices.dofs, () => at, faults) ?? undefined;
  }
  return checkHeight(
    readReference(left, at, "left", matrices, faults),
    left,
    at,
    matrices.dofs,
    "rows",
    faults,
  );
}

/** C, p×n; null: identity; undefined after a fault, here or in what it refers to. */
function readRight(
  right: file.Right,
  at: string,
  matrices: Matrices,
  faults: FaultList,
): Triplets | null | undefined {
  if (typeof right !== "string") {
    if (matrices.dofs === null) return undefined;
    const columns =
      "rows" in right
        ? columnsOf(right.rows, matrices.dofs, (k) => `${at}/rows/${k}`, faults)
        : columnsOf([right], matrices.dofs, () => at, faults);
    return columns === null ? undefined : transposed(columns);
  }
  return checkHeight(
    readReference(right, at, "right", matrices, faults),
    right,
    at,
    matrices.dofs,
    "cols",
    faults,
  );
}

/** Resolves "identity", NAME, NAME.left or NAME.right; factors of products stand as columns left, as rows right. */
function readReference(
  reference: string,
  at: string,
  side: "left" | "right",
  { sound, declared }: Matrices,
  faults: FaultList,
): Triplets | null | undefined {
  if (reference === "identity") return null;
  const [, name, factor] = /^(.*?)(?:\.(left|right))?$/s.exec(reference) ?? [];
  const matrix = sound.get(name);
  if (matrix === undefined) {
    if (declared.includes(name)) return undefined;
    const hint = suggest(name, [...declared, "identity"], "matrix");
    faults.add("input.unknown-matrix", at, `no matrix is called "${name}"`, hint);
    return undefined;
  }
  if (factor === undefined) return matrix.triplets;
  const columns = factor === "left" ? matrix.left : matrix.right;
  if (columns === undefined) {
    const message = `"${name}" is given by ${matrix.form}; only an outer product has .left and .right`;
    faults.add("input.matrix-form", at, message, `Write "${name}", or make it an outer product.`);
    return undefined;
  }
  return side === "left" ? columns : transposed(columns);
}

function checkHeight(
  found: Triplets | null | undefined,
  reference: string,
  at: string,
  dofs: number | null,
  measure: "rows" | "cols",
  faults: FaultList,
): Triplets | null | undefined {
  if (found === null || found === undefined || dofs === null || found[measure] === dofs) return found;
  const expected =
    measure === "rows" ? `${dofs} rows, as the model has dofs` : `${dofs} columns, as the model has dofs`;
  const message = `"${reference}" is ${found.rows} × ${found.cols}; expected ${expected}`;
  faults.add("input.matrix-shape", at, message, "left is dofs × m, right is p × dofs.");
  return undefined;
}

/** What `scalar` and `symmetric` ask of the two sides. */
function checkKind(
  { kind, acts, left, right }: Perturbation,
  at: string,
  dofs: number | null,
  faults: FaultList,
): void {
  const m = left === null ? dofs : left.cols;
  const p = right === null ? dofs : right.rows;
  if (kind === "scalar" && m !== p) {
    const message = `a scalar perturbation multiplies the identity, but left has ${m} columns and right ${p} rows`;
    faults.add("input.matrix-shape", at, message, "Give equally many.");
  }
  if (kind !== "symmetric") return;
  if (acts !== "damping") {
    const message = "a symmetric perturbation is one of the damping";
    faults.add("input.value", `${at}/acts`, message, 'Write "acts": "damping", or use the kind "real".');
  }
  const mirrored =
    left === null || right === null ? left === right : m === p && agree(left, transposed(right));
  if (mirrored) return;
  const message = "a symmetric perturbation needs right to be the transpose of left";
  faults.add("input.matrix-shape", `${at}/right`, message, "Give the same vectors on both sides.");
}
