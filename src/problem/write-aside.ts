import { randomUUID } from "node:crypto";
import { rmSync } from "node:fs";
import { type FileHandle, open, rename, rm } from "node:fs/promises";
import { basename, dirname, join } from "node:path";
import { InputError } from "../errors.js";

const unfinished = new Set<string>();

/** Removes the temporary files of all writes under way: for a process that is about to end without waiting for them. */
export function removeUnfinished(): void {
  for (const aside of unfinished) rmSync(aside, { force: true });
}

/**
 * Writes a file so that it stands there whole or not at all: to a temporary name in the same folder,
 * flushed to the disk, then renamed over `path`. After a failure the old file is untouched
 * and nothing is left behind. The folder must exist.
 *
 * @throws InputError `output.unwritable` where the disk refuses; errors of `chunks` pass through.
 */
export async function writeAside(
  path: string,
  chunks: Iterable<string | Uint8Array> | AsyncIterable<string | Uint8Array>,
): Promise<void> {
  const aside = join(dirname(path), `.${basename(path)}.${randomUUID()}.part`);
  let file: FileHandle | undefined;
  unfinished.add(aside);
  try {
    file = await open(aside, "wx");
    for await (const chunk of chunks) await file.writeFile(chunk);
    await file.sync();
    await file.close();
    await rename(aside, path);
  } catch (error) {
    await file?.close().catch(() => undefined);
    await rm(aside, { force: true }).catch(() => undefined);
    throw writingFault(error, path);
  } finally {
    unfinished.delete(aside);
  }
}

function writingFault(error: unknown, path: string): unknown {
  if (!(error instanceof Error) || !("code" in error) || !("syscall" in error)) return error;
  const hint = "Give a path in an existing folder you may write to, on a disk with room.";
  return InputError.of("output.unwritable", path, `the file cannot be written (${String(error.code)})`, hint);
}
