import { createHash } from "node:crypto";
import { type FileHandle, open } from "node:fs/promises";
import { pipeline } from "node:stream/promises";
import { createGunzip } from "node:zlib";
import { InputError } from "../errors.js";
import { MatrixMarketParser, type Symmetry } from "./matrix-market-parser.js";
import type { Triplets } from "./problem.js";

/** A matrix as it was read, symmetric and skew ones expanded to both triangles. */
export interface MatrixMarketMatrix extends Triplets {
  readonly symmetry: Symmetry;
  /** Digest and size of the file on disk. */
  readonly sha256: string;
  readonly bytes: number;
}

/**
 * Reads a Matrix Market file, plain or gzip (told apart by content), in pieces: coordinate or array;
 * real, integer or pattern (entries 1); general, symmetric or skew-symmetric. Duplicates are kept.
 * Cost O(bytes); memory about 32 bytes per entry at the peak, never the text.
 *
 * @param shownAs - Name of the file in messages.
 * @throws InputError with the first fault of the file.
 * Source: Boisvert, Pozo, Remington, The Matrix Market Exchange Formats, NISTIR 5935 (1996).
 */
export async function readMatrixMarket(path: string, shownAs: string = path): Promise<MatrixMarketMatrix> {
  const parser = new MatrixMarketParser(shownAs);
  const hash = createHash("sha256");
  let bytes = 0;
  async function* recorded(source: AsyncIterable<Buffer>): AsyncGenerator<Buffer> {
    for await (const chunk of source) {
      hash.update(chunk);
      bytes += chunk.length;
      yield chunk;
    }
  }
  async function parse(source: AsyncIterable<Buffer>): Promise<void> {
    for await (const chunk of source) parser.feed(chunk);
  }
  let file: FileHandle | undefined;
  try {
    file = await open(path);
    const zipped = await isGzip(file);
    const source = file.createReadStream({ start: 0, highWaterMark: 1 << 20, autoClose: false });
    if (zipped) await pipeline(source, recorded, createGunzip({ chunkSize: 1 << 18 }), parse);
    else await pipeline(source, recorded, parse);
  } catch (error) {
    throw readingFault(error, shownAs);
  } finally {
    await file?.close();
  }
  return { ...parser.finish(), sha256: hash.digest("hex"), bytes };
}

async function isGzip(file: FileHandle): Promise<boolean> {
  const { buffer, bytesRead } = await file.read(Buffer.alloc(2), 0, 2, 0);
  return bytesRead === 2 && buffer[0] === 0x1f && buffer[1] === 0x8b;
}

/** Faults of the disk or of the compression as faults of the input; anything else unchanged. */
export function readingFault(error: unknown, shownAs: string): unknown {
  if (!(error instanceof Error) || !("code" in error) || error instanceof InputError) return error;
  const code = String(error.code);
  if (code === "ENOENT" || code === "ENOTDIR") {
    return InputError.of(
      "input.file-missing",
      shownAs,
      "there is no such file",
      "Check the path and its spelling.",
    );
  }
  if (code.startsWith("Z_")) {
    const message = `the compressed data are damaged or cut off (${error.message})`;
    return InputError.of("input.matrix-gzip", shownAs, message, "Export or copy the file again.");
  }
  if ("syscall" in error) {
    const hint = "Give the path of a file you may read.";
    return InputError.of("input.file-unreadable", shownAs, `the file cannot be read (${code})`, hint);
  }
  return error;
}
