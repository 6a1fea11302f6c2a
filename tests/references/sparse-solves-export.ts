/** Writes the cases for sparse-solves.py, one file each, into the folder given as argument. */

import { join } from "node:path";
import { writeArrays } from "../benchmarks/exchange.js";
import { solveCases } from "./sparse-solves-cases.js";

const folder = process.argv[2];
if (folder === undefined) throw new Error("say into which folder");
for (const { name, pattern, dynamic, undamped, right, weights } of solveCases()) {
  writeArrays(join(folder, name), [
    Int32Array.of(pattern.cols, pattern.rowIndex.length, weights.length),
    pattern.colStart,
    pattern.rowIndex,
    dynamic.re,
    dynamic.im,
    undamped,
    ...[right, ...weights].flatMap(({ re, im }) => [re, im]),
  ]);
}
