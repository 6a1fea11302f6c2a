import { readdir, realpath, stat } from "node:fs/promises";
import { basename, dirname, isAbsolute, join, relative, resolve, sep } from "node:path";
import { InputError } from "../errors.js";
import type { FaultList } from "./fault-list.js";
import { type MatrixMarketMatrix, readingFault, readMatrixMarket } from "./matrix-market.js";
import { nearest } from "./nearest.js";
import type { InputFile } from "./problem.js";

/** Reads the matrix files of one problem, each once, from inside the folder of the problem file only. */
export class MatrixFiles {
  readonly inputs: InputFile[] = [];
  private readonly path: string;
  private readonly faults: FaultList;
  private readonly read = new Map<string, MatrixMarketMatrix | null>();

  /** @param path - The problem file. */
  constructor(path: string, faults: FaultList) {
    this.path = path;
    this.faults = faults;
  }

  /**
   * @param name - Path relative to the problem file.
   * @param at - JSON pointer of the name.
   * @returns null after adding a fault.
   */
  async open(name: string, at: string): Promise<MatrixMarketMatrix | null> {
    try {
      const folder = await realpath(dirname(this.path));
      const file = await this.locate(folder, name, at);
      if (file === null) return null;
      const known = this.read.get(file);
      if (known !== undefined) return known;
      this.read.set(file, null);
      const matrix = await readMatrixMarket(file, join(dirname(this.path), name));
      this.read.set(file, matrix);
      const shown = relative(folder, resolve(folder, name)).split(sep).join("/");
      this.inputs.push({ path: shown, sha256: matrix.sha256, bytes: matrix.bytes });
      return matrix;
    } catch (error) {
      this.faults.absorb(error);
      return null;
    }
  }

  /** The real path of a regular file inside `folder`, links followed; null after adding a fault. */
  private async locate(folder: string, name: string, at: string): Promise<string | null> {
    const wanted = resolve(folder, name);
    if (!isInside(folder, wanted)) return this.refuseOutside(name, at);
    try {
      const real = await realpath(wanted);
      if (!isInside(folder, real)) return this.refuseOutside(name, at);
      if ((await stat(real)).isFile()) return real;
      this.faults.add(
        "input.file-unreadable",
        at,
        `"${name}" is no file`,
        "Give the path of a .mtx or .mtx.gz file.",
      );
    } catch (error) {
      const fault = readingFault(error, name);
      if (!(fault instanceof InputError)) throw fault;
      const near =
        fault.code === "input.file-missing" ? nearest(basename(name), await siblings(wanted)) : undefined;
      const hint = near === undefined ? fault.hint : `Did you mean "${join(dirname(name), near)}"?`;
      this.faults.add(fault.code, at, `"${name}": ${fault.faults[0].message}`, hint);
    }
    return null;
  }

  private refuseOutside(name: string, at: string): null {
    const message = `"${name}" lies outside the folder of the problem file`;
    this.faults.add(
      "input.file-outside",
      at,
      message,
      "Copy the file into that folder; links out of it are refused.",
    );
    return null;
  }
}

function isInside(folder: string, path: string): boolean {
  const way = relative(folder, path);
  return way !== "" && way !== ".." && !way.startsWith(`..${sep}`) && !isAbsolute(way);
}

async function siblings(path: string): Promise<string[]> {
  return readdir(dirname(path)).catch(() => []);
}
