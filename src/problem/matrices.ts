import type { ProblemDocument } from "./document.js";
import type { FaultList } from "./fault-list.js";
import { fromEntries, fromLinks, fromOuter } from "./inline-matrix.js";
import type { MatrixFiles } from "./matrix-files.js";
import type { MatrixMarketMatrix } from "./matrix-market.js";
import { isObjectWord } from "./parameters.js";
import type { NamedMatrix, TermGroup } from "./problem.js";
import type * as file from "./problem-file.js";
import { asymmetry } from "./symmetry.js";

export interface Matrices {
  /** Number of dofs; null where it could not be told (which is a fault). */
  readonly dofs: number | null;
  readonly sound: ReadonlyMap<string, NamedMatrix>;
  /** Names of all matrices, sound or not. */
  readonly declared: readonly string[];
  /** +1, −1: stored as symmetric, as skew-symmetric; so nothing is left to check. */
  readonly stored: ReadonlyMap<string, 1 | -1>;
}

export const termGroups: readonly TermGroup[] = [
  "mass",
  "damping",
  "gyroscopic",
  "stiffness",
  "circulatory",
  "frictional",
];

const largestModel = 50_000_000;

/** Reads all matrices, files first: one of them tells the number of dofs where the problem file does not. */
export async function readMatrices(
  document: ProblemDocument,
  files: MatrixFiles,
  faults: FaultList,
): Promise<Matrices> {
  const entries = Object.entries(document.content.matrices ?? {});
  for (const [name] of entries) checkName(name, faults);
  const read = new Map<string, MatrixMarketMatrix>();
  for (const [name, matrix] of entries) {
    if (!("file" in matrix)) continue;
    const found = await files.open(matrix.file, `/matrices/${name}/file`);
    if (found !== null && fits(found, name, faults)) read.set(name, found);
  }
  const dofs = document.content.dofs ?? sizeOfTerms(document, read);
  if (dofs === null) missingDofs(document, read, faults);
  const sound = new Map<string, NamedMatrix>();
  const stored = new Map<string, 1 | -1>();
  for (const [name, matrix] of entries) {
    const named = toNamed(name, matrix, read.get(name), dofs, faults);
    if (named !== null) sound.set(name, named);
    const symmetry = "links" in matrix ? "symmetric" : read.get(name)?.symmetry;
    if (symmetry === "symmetric") stored.set(name, 1);
    if (symmetry === "skew-symmetric") stored.set(name, -1);
  }
  return { dofs, sound, declared: document.declared.matrices, stored };
}

function checkName(name: string, faults: FaultList): void {
  if (name !== "identity" && !isObjectWord(name)) return;
  const message = `"${name}" cannot be a name: it has a meaning of its own`;
  faults.add("input.name", `/matrices/${name}`, message, "Rename it.");
}

function fits({ rows, cols }: MatrixMarketMatrix, name: string, faults: FaultList): boolean {
  if (rows <= largestModel && cols <= largestModel) return true;
  const message = `the matrix is ${rows} × ${cols}; at most ${largestModel} dofs are possible`;
  faults.add("input.matrix-size", `/matrices/${name}/file`, message, "Check the line of sizes in the file.");
  return false;
}

/** Size of the first square matrix file that a term uses. */
function sizeOfTerms(
  { content }: ProblemDocument,
  read: ReadonlyMap<string, MatrixMarketMatrix>,
): number | null {
  for (const group of termGroups) {
    for (const term of content.terms?.[group] ?? []) {
      const matrix = read.get(term?.matrix ?? "");
      if (matrix !== undefined && matrix.rows === matrix.cols) return matrix.rows;
    }
  }
  return null;
}

/** Missing dofs are a fault unless a part already refused would have told them. */
function missingDofs(
  { content, spoilt }: ProblemDocument,
  read: ReadonlyMap<string, MatrixMarketMatrix>,
  faults: FaultList,
): void {
  const lost = Object.entries(content.matrices ?? {}).some(([name, m]) => "file" in m && !read.has(name));
  if (lost || ["dofs", "matrices", "terms"].some((key) => spoilt.has(key))) return;
  if (content.matrices === undefined || content.terms === undefined) return;
  const message = "the number of dofs is not known: no square matrix file stands in a term";
  faults.add("input.dofs-missing", "", message, 'Add "dofs".');
}

function toNamed(
  name: string,
  matrix: file.Matrix,
  read: MatrixMarketMatrix | undefined,
  dofs: number | null,
  faults: FaultList,
): NamedMatrix | null {
  const at = `/matrices/${name}`;
  if ("file" in matrix) {
    if (read === undefined) return null;
    const { rows, cols, row, col, value } = read;
    return { name, form: "file", triplets: { rows, cols, row, col, value } };
  }
  if ("entries" in matrix) {
    const triplets = fromEntries(matrix, dofs, at, faults);
    return triplets && { name, form: "entries", triplets };
  }
  if (dofs === null) return null;
  if ("links" in matrix) {
    const triplets = fromLinks(matrix, dofs, at, faults);
    return triplets && { name, form: "links", triplets };
  }
  const factors = fromOuter(matrix, dofs, at, faults);
  return factors && { name, form: "outer", ...factors };
}

/** What each group asks of its matrices: A = sign·Aᵀ, and where an unsymmetric rest belongs. */
const symmetryOf: Readonly<Partial<Record<TermGroup, { readonly sign: 1 | -1; readonly hint: string }>>> = {
  mass: { sign: 1, hint: "Export the mass matrix again; it is symmetric." },
  damping: { sign: 1, hint: "Move the unsymmetric part to gyroscopic (if skew) or frictional." },
  gyroscopic: { sign: -1, hint: "Move the part that is not skew to damping or frictional." },
  stiffness: { sign: 1, hint: "Move the unsymmetric part to circulatory." },
};

/** Checks that a matrix has the size and the symmetry that its group of terms needs. */
export class TermMatrixChecker {
  private readonly matrices: Matrices;
  private readonly faults: FaultList;
  private readonly checked = new Map<string, ReturnType<typeof asymmetry>>();

  constructor(matrices: Matrices, faults: FaultList) {
    this.matrices = matrices;
    this.faults = faults;
  }

  check(matrix: NamedMatrix, group: TermGroup, at: string): void {
    const { dofs } = this.matrices;
    const { rows, cols } = matrix.triplets;
    if (rows !== cols || (dofs !== null && rows !== dofs)) {
      const message = `"${matrix.name}" is ${rows} × ${cols}; expected ${dofs ?? "n"} × ${dofs ?? "n"}`;
      this.faults.add("input.matrix-shape", at, message, "Use matrices of one model only, and check dofs.");
      return;
    }
    const wanted = symmetryOf[group];
    if (wanted === undefined || this.matrices.stored.get(matrix.name) === wanted.sign) return;
    const worst = this.worst(matrix, wanted.sign);
    if (worst === null) return;
    const { row, col, value, mirrored } = worst;
    const kind = wanted.sign === 1 ? "symmetric" : "skew-symmetric";
    const message =
      `"${matrix.name}" is not ${kind}, as ${group} must be: ` +
      `entry (${row + 1}, ${col + 1}) is ${value}, entry (${col + 1}, ${row + 1}) is ${mirrored}`;
    this.faults.add(wanted.sign === 1 ? "input.not-symmetric" : "input.not-skew", at, message, wanted.hint);
  }

  private worst(matrix: NamedMatrix, sign: 1 | -1): ReturnType<typeof asymmetry> {
    const key = `${matrix.name} ${sign}`;
    const known = this.checked.get(key);
    if (known !== undefined) return known;
    const worst = asymmetry(matrix.triplets, sign);
    this.checked.set(key, worst);
    return worst;
  }
}
