import { pipeline, Readable } from "node:stream";
import { createGzip } from "node:zlib";
import { invariant } from "../errors.js";
import type { Symmetry } from "./matrix-market-header.js";
import type { Triplets } from "./problem.js";
import { asymmetry } from "./symmetry.js";
import { writeAside } from "./write-aside.js";

/** Entries per piece of text. */
const batch = 8192;

/**
 * Writes a coordinate Matrix Market file of real numbers that read back to the same bits, gzip where
 * `path` ends in .gz, aside and renamed. Of symmetric and skew-symmetric matrices, which
 * come with both triangles, the lower triangle is written; they must be so to 1e-10 of the largest entry.
 */
export async function writeMatrixMarket(
  path: string,
  triplets: Triplets,
  symmetry: Symmetry = "general",
): Promise<void> {
  if (symmetry !== "general") {
    const worst = asymmetry(triplets, symmetry === "symmetric" ? 1 : -1);
    invariant(worst === null, `a matrix written as ${symmetry} is so`);
  }
  const text = textOf(triplets, symmetry);
  await writeAside(path, path.endsWith(".gz") ? zipped(text) : text);
}

function* textOf({ rows, cols, row, col, value }: Triplets, symmetry: Symmetry): Generator<string> {
  const lowest = symmetry === "general" ? Number.NEGATIVE_INFINITY : symmetry === "symmetric" ? 0 : 1;
  let entries = 0;
  for (let t = 0; t < value.length; t++) if (row[t] - col[t] >= lowest) entries++;
  yield `%%MatrixMarket matrix coordinate real ${symmetry}\n${rows} ${cols} ${entries}\n`;
  for (let from = 0; from < value.length; from += batch) {
    let text = "";
    for (let t = from; t < Math.min(from + batch, value.length); t++) {
      if (row[t] - col[t] < lowest) continue;
      invariant(Number.isFinite(value[t]), "a matrix written to a file is finite");
      text += `${row[t] + 1} ${col[t] + 1} ${Object.is(value[t], -0) ? "-0" : value[t]}\n`;
    }
    yield text;
  }
}

function zipped(text: Iterable<string>): AsyncIterable<Uint8Array> {
  const gzip = createGzip();
  // The error of a failed source reaches whoever reads `gzip`, so nothing is left to do at the end.
  pipeline(Readable.from(text), gzip, () => undefined);
  return gzip;
}
