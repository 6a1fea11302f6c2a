import { InputError } from "../errors.js";
import { LineScanner } from "./line-scanner.js";
import {
  type Banner,
  type Format,
  parseBanner,
  parseSize,
  type Size,
  type Symmetry,
} from "./matrix-market-header.js";
import type { Triplets } from "./problem.js";
import { TripletStore } from "./triplet-store.js";

export type { Symmetry };

const newline = 10;
const longestLine = 1 << 16;
const decimal = /^[-+]?(\d+\.?\d*|\.\d+)([eEdD][-+]?\d+)?$/;
const notFinite = /^[-+]?(nan|inf|infinity)$/i;

/** Takes the bytes of a Matrix Market file piece by piece. Faults are thrown with their line. */
export class MatrixMarketParser {
  private readonly file: string;
  private readonly scanner = new LineScanner();
  private line = 0;
  /** Start of a line whose end has not come yet. */
  private carry: Buffer = Buffer.alloc(0);
  private banner: Banner | null = null;
  private size: Size | null = null;
  private store: TripletStore = new TripletStore(0);
  /** Entries taken so far. */
  private taken = 0;
  /** Where the next entry of an array file stands. */
  private row = 0;
  private col = 0;

  constructor(file: string) {
    this.file = file;
  }

  feed(chunk: Buffer): void {
    const first = chunk.indexOf(newline) + 1;
    if (first === 0) {
      this.keep(Buffer.concat([this.carry, chunk]));
      return;
    }
    if (this.carry.length > 0) this.consume(Buffer.concat([this.carry, chunk.subarray(0, first)]));
    else this.consume(chunk.subarray(0, first));
    const last = chunk.lastIndexOf(newline) + 1;
    this.consume(chunk.subarray(first, last));
    this.keep(Buffer.from(chunk.subarray(last)));
  }

  finish(): Triplets & { readonly symmetry: Symmetry } {
    if (this.carry.length > 0) this.consume(Buffer.concat([this.carry, Uint8Array.of(newline)]));
    const { banner, size } = this;
    if (banner === null) this.fault("input.matrix-header", "the file is empty", "Export the matrix again.");
    if (size === null)
      this.fault("input.matrix-size", "the line of sizes is missing", "Export the matrix again.");
    if (this.taken < size.entries) {
      this.fault(
        "input.matrix-count",
        `the file ends after ${this.taken} of ${size.entries} entries`,
        "The file is probably cut off: export or copy it again.",
      );
    }
    return { rows: size.rows, cols: size.cols, ...this.store.arrays(), symmetry: banner.symmetry };
  }

  private keep(rest: Buffer): void {
    this.carry = rest;
    if (rest.length <= longestLine) return;
    this.line++;
    const message = `a line is longer than ${longestLine} characters`;
    this.fault("input.matrix-line", message, "Write one entry per line, lines ending with a line feed.");
  }

  /** Takes whole lines. */
  private consume(bytes: Buffer): void {
    const { scanner } = this;
    scanner.bytes = bytes;
    scanner.at = 0;
    while (scanner.at < bytes.length) {
      this.line++;
      if (this.banner === null) {
        this.banner = parseBanner(this.restOfLine(), (code, message, hint) =>
          this.fault(code, message, hint),
        );
        continue;
      }
      const c = scanner.skipBlanks();
      if (c === newline) scanner.at++;
      else if (c === 37) scanner.skipLine();
      else if (this.size === null) this.begin(this.banner);
      else this.takeEntry(this.banner.format, this.size);
    }
  }

  private restOfLine(): string {
    const { bytes, at } = this.scanner;
    this.scanner.skipLine();
    return bytes.toString("latin1", at, this.scanner.at - 1);
  }

  private begin(banner: Banner): void {
    this.size = parseSize(this.restOfLine(), banner, (code, message, hint) =>
      this.fault(code, message, hint),
    );
    this.store = new TripletStore(banner.symmetry === "general" ? this.size.entries : 2 * this.size.entries);
    this.row = banner.symmetry === "skew-symmetric" ? 1 : 0;
  }

  private takeEntry(format: Format, size: Size): void {
    if (this.taken === size.entries) {
      const message = `there are more entries than the ${size.entries} declared`;
      this.fault("input.matrix-count", message, "Correct the count in the line of sizes, or export again.");
    }
    if (format === "coordinate") this.takeCoordinate(size);
    else this.takeArray(size);
    if (!this.scanner.endsLine()) this.malformed();
    this.taken++;
  }

  private takeCoordinate({ rows, cols }: Size): void {
    const i = this.scanner.index();
    const j = this.scanner.index();
    if (i < 0 || j < 0) this.malformed();
    if (i < 1 || i > rows || j < 1 || j > cols) {
      const message = `entry (${i}, ${j}) lies outside the ${rows} × ${cols} matrix`;
      this.fault("input.matrix-index", message, "Indices count from 1: check the export.");
    }
    const value = this.takeValue();
    this.put(i - 1, j - 1, value);
  }

  /** Arrays go column by column; of symmetric ones only the lower triangle is stored. */
  private takeArray({ rows }: Size): void {
    const value = this.takeValue();
    if (value !== 0) this.put(this.row, this.col, value);
    if (++this.row < rows) return;
    this.col++;
    const { symmetry } = this.banner as Banner;
    this.row = symmetry === "general" ? 0 : symmetry === "symmetric" ? this.col : this.col + 1;
  }

  private takeValue(): number {
    const { field } = this.banner as Banner;
    if (field === "pattern") return 1;
    const start = this.scanner.at;
    const value = this.scanner.real();
    if (!Number.isFinite(value) || (field === "integer" && !Number.isInteger(value)))
      this.refuseValue(start, field);
    return value;
  }

  private put(i: number, j: number, value: number): void {
    const { symmetry } = this.banner as Banner;
    this.store.push(i, j, value);
    if (symmetry === "general") return;
    if (i < j) {
      const message = `entry (${i + 1}, ${j + 1}) lies above the diagonal of a ${symmetry} matrix`;
      this.fault(
        "input.matrix-triangle",
        message,
        "Store the lower triangle only, or declare the matrix general.",
      );
    }
    if (i > j) this.store.push(j, i, symmetry === "symmetric" ? value : -value);
    else if (symmetry === "skew-symmetric" && value !== 0) {
      const message = `the diagonal entry (${i + 1}, ${i + 1}) = ${value} of a skew-symmetric matrix is not 0`;
      this.fault("input.matrix-diagonal", message, "Remove the entry, or declare the matrix general.");
    }
  }

  private refuseValue(start: number, field: string): never {
    this.scanner.at = start;
    const word = this.restOfLine().trim().split(/\s/)[0].slice(0, 40);
    if (decimal.test(word) && Number.isFinite(Number(word.replace(/[dD]/, "e")))) {
      const message = `expected a whole number in an ${field} matrix, found ${word}`;
      this.fault("input.matrix-entry", message, "Declare the matrix real.");
    }
    if (!decimal.test(word) && !notFinite.test(word)) this.malformed(word);
    const hint = "Every entry must be finite: check the model the matrix comes from.";
    this.fault("input.matrix-non-finite", `the entry ${word} is not a finite number`, hint);
  }

  private malformed(word?: string): never {
    const { format, field } = this.banner as Banner;
    const value = field === "pattern" ? "" : " value";
    const expected = format === "array" ? "one value" : `"row column${value}"`;
    const found = !word ? "" : `, found "${word}"`;
    const message = `expected ${expected} on this line${found}`;
    this.fault("input.matrix-entry", message, "Write one entry per line, numbers separated by blanks.");
  }

  private fault(code: string, message: string, hint: string): never {
    throw InputError.of(code, `${this.file}:${Math.max(1, this.line)}`, message, hint);
  }
}
