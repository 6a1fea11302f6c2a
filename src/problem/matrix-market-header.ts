/** The banner and the line of sizes of a Matrix Market file. */

export type Format = "coordinate" | "array";
export type Field = "real" | "integer" | "pattern";
export type Symmetry = "general" | "symmetric" | "skew-symmetric";

export interface Banner {
  readonly format: Format;
  readonly field: Field;
  readonly symmetry: Symmetry;
}

export interface Size {
  readonly rows: number;
  readonly cols: number;
  /** Entries stored in the file. */
  readonly entries: number;
}

/** Throws a fault at the current line. */
export type Refuse = (code: string, message: string, hint: string) => never;

const largestSize = 2 ** 31 - 1;
const mostEntries = 5e8;

/** Reads "%%MatrixMarket matrix FORMAT FIELD SYMMETRY", letters of either case. */
export function parseBanner(line: string, refuse: Refuse): Banner {
  const words = line.toLowerCase().trim().split(/\s+/);
  if (words[0] !== "%%matrixmarket" || words[1] !== "matrix" || words.length !== 5) {
    const found = JSON.stringify(line.slice(0, 60));
    const hint = "Export the matrix in Matrix Market format (.mtx or .mtx.gz).";
    return refuse(
      "input.matrix-header",
      `expected "%%MatrixMarket matrix FORMAT FIELD SYMMETRY", found ${found}`,
      hint,
    );
  }
  const format = oneOf(words[2], ["coordinate", "array"], "format", refuse);
  const field = oneOf(words[3], ["real", "integer", "pattern"], "field", refuse);
  const symmetry = oneOf(words[4], ["general", "symmetric", "skew-symmetric"], "symmetry", refuse);
  if (field === "pattern" && (format === "array" || symmetry === "skew-symmetric")) {
    const message = `a pattern matrix cannot be ${format === "array" ? "an array" : symmetry}`;
    refuse("input.matrix-header", message, "Export the matrix with its values, as real.");
  }
  return { format, field, symmetry };
}

function oneOf<T extends string>(word: string, allowed: readonly T[], what: string, refuse: Refuse): T {
  const found = allowed.find((each) => each === word);
  if (found !== undefined) return found;
  const isComplex = word === "complex" || word === "hermitian";
  const hint = isComplex
    ? "Model matrices are real: export real and imaginary part as matrices of their own, as stiffness and damping."
    : `Use one of: ${allowed.join(", ")}.`;
  return refuse("input.matrix-field", `the ${what} "${word.slice(0, 40)}" is not supported`, hint);
}

/** Reads "rows cols entries" (coordinate) or "rows cols" (array) and refuses impossible or huge sizes. */
export function parseSize(line: string, { format, symmetry }: Banner, refuse: Refuse): Size {
  const expected = format === "coordinate" ? 3 : 2;
  const words = line.trim().split(/\s+/);
  if (words.length !== expected || !words.every((word) => /^\d+$/.test(word))) {
    const wanted = format === "coordinate" ? "rows columns entries" : "rows columns";
    const message = `expected "${wanted}", found ${JSON.stringify(line.trim().slice(0, 60))}`;
    return refuse("input.matrix-size", message, "Check the line of sizes behind the comments.");
  }
  const [rows, cols, declared] = words.map(Number);
  if (rows < 1 || cols < 1 || rows > largestSize || cols > largestSize) {
    const message = `a matrix of ${rows} × ${cols} is out of range; 1 to ${largestSize} rows and columns are`;
    return refuse("input.matrix-size", `${message} allowed`, "Check the line of sizes.");
  }
  if (symmetry !== "general" && rows !== cols) {
    const message = `a ${symmetry} matrix must be square, found ${rows} × ${cols}`;
    return refuse("input.matrix-size", message, "Declare the matrix general, or correct its sizes.");
  }
  const entries = format === "coordinate" ? declared : stored(rows, cols, symmetry);
  if (entries > mostEntries) {
    const message = `${entries} entries are more than the ${mostEntries} that can be read`;
    return refuse("input.matrix-size", message, "Check the line of sizes, or use a coarser model.");
  }
  return { rows, cols, entries };
}

/** How many values an array file holds. */
function stored(rows: number, cols: number, symmetry: Symmetry): number {
  if (symmetry === "general") return rows * cols;
  return symmetry === "symmetric" ? (rows * (rows + 1)) / 2 : (rows * (rows - 1)) / 2;
}
