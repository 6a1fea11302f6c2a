/** Hands arrays to a Python child: one file, arrays end to end in the order given, native byte order. */

import { closeSync, openSync, writeSync } from "node:fs";

type Numbers = Int32Array | Float64Array;

/** Largest single write; Linux takes no more than 2 GiB. */
const CHUNK_BYTES = 2 ** 30;

export function writeArrays(path: string, arrays: readonly Numbers[]): void {
  const file = openSync(path, "w");
  for (const array of arrays) {
    const bytes = new Uint8Array(array.buffer, array.byteOffset, array.byteLength);
    for (let at = 0; at < bytes.length; ) at += writeSync(file, bytes.subarray(at, at + CHUNK_BYTES));
  }
  closeSync(file);
}
