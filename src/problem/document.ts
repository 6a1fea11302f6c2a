import { createHash } from "node:crypto";
import { readFile, stat } from "node:fs/promises";
import { basename } from "node:path";
import { InputError } from "../errors.js";
import type { FaultList } from "./fault-list.js";
import { parseJson } from "./json-text.js";
import { readingFault } from "./matrix-market.js";
import type { InputFile, TermGroup } from "./problem.js";
import type * as file from "./problem-file.js";
import { SchemaChecker, type SchemaFault } from "./schema.js";

/** A problem file without the parts that break the schema: their list elements are null, the rest is absent. */
export interface PrunedFile extends Partial<Omit<file.ProblemFile, "terms" | "perturbations">> {
  readonly terms?: Readonly<Partial<Record<TermGroup, readonly (file.Term | null)[]>>>;
  readonly perturbations?: readonly (file.Perturbation | null)[];
}

export type NamedBlock = "matrices" | "constants" | "envelope" | "design" | "budget";

export interface ProblemDocument {
  readonly content: PrunedFile;
  /** All names written under a block, also those whose content was pruned. */
  readonly declared: Readonly<Record<NamedBlock, readonly string[]>>;
  /** Top-level keys of which something was pruned: what follows from their absence is no fault. */
  readonly spoilt: ReadonlySet<string>;
  readonly input: InputFile;
}

type Tree = { [key: string]: Tree | null };

const largestFile = 2 ** 28;
const namedBlocks: readonly string[] = ["matrices", "constants", "envelope", "design", "budget"];

/**
 * Reads and checks a problem file against the schema. Faults of the schema are added to `faults` and
 * their places pruned, so that what is left can be checked too.
 *
 * @throws InputError where nothing can be checked: unreadable, no JSON, no object.
 */
export async function readDocument(path: string, faults: FaultList): Promise<ProblemDocument> {
  const bytes = await readBytes(path);
  const { value, faults: jsonFaults } = parseJson(decode(bytes, path));
  for (const { code, pointer, line, column, message } of jsonFaults) {
    const hint =
      code === "input.duplicate-key" ? "Remove or rename one of the two." : "Correct the JSON there.";
    faults.add(code, pointer, `line ${line}, column ${column}: ${message}`, hint);
  }
  if (value === undefined) faults.throwIfAny();
  const schemaFaults = new SchemaChecker().check(value);
  for (const { code, pointer, message, hint } of schemaFaults) faults.add(code, pointer, message, hint);
  if (typeof value !== "object" || value === null || Array.isArray(value)) faults.throwIfAny();
  const tree = value as Tree;
  const names = (block: NamedBlock): string[] => {
    const found: unknown = tree[block];
    return typeof found === "object" && found !== null && !Array.isArray(found) ? Object.keys(found) : [];
  };
  const declared = {
    matrices: names("matrices"),
    constants: names("constants"),
    envelope: names("envelope"),
    design: names("design"),
    budget: names("budget"),
  };
  const spoilt = new Set(schemaFaults.map((fault) => prune(tree, fault)));
  const sha256 = createHash("sha256").update(bytes).digest("hex");
  const input = { path: basename(path), sha256, bytes: bytes.length };
  return { content: tree as PrunedFile, declared, spoilt, input };
}

async function readBytes(path: string): Promise<Buffer> {
  try {
    const about = await stat(path);
    if (about.isFile() && about.size <= largestFile) return await readFile(path);
    const message = about.isFile()
      ? `the file has ${about.size} bytes, more than ${largestFile}`
      : "this is no file";
    const hint = "Give the path of a problem file; put large matrices into files of their own.";
    throw InputError.of("input.file-unreadable", path, message, hint);
  } catch (error) {
    throw readingFault(error, path);
  }
}

/** UTF-8, a byte-order mark at the start is dropped. */
function decode(bytes: Buffer, path: string): string {
  try {
    return new TextDecoder("utf-8", { fatal: true }).decode(bytes);
  } catch {
    const message = "the file is not written in UTF-8";
    throw InputError.of("input.json-syntax", path, message, "Save it as UTF-8.");
  }
}

/** Removes the smallest whole thing around a fault, in place, and tells the top-level key it belonged to. */
function prune(tree: Tree, { code, pointer }: SchemaFault): string {
  const path = pointer
    .split("/")
    .slice(1)
    .map((segment) => segment.replaceAll("~1", "/").replaceAll("~0", "~"));
  const key = path[0] ?? "";
  const keep =
    code === "input.unknown-key" ? path.length : namedBlocks.includes(key) ? 2 : (depths.get(key) ?? 1);
  const kept = path.slice(0, Math.min(keep, path.length));
  const last = kept.pop();
  if (last === undefined) return key;
  const parent = kept.reduce<Tree | null | undefined>((node, segment) => node?.[segment], tree);
  if (Array.isArray(parent)) parent[Number(last)] = null;
  else if (parent !== null && parent !== undefined) delete parent[last];
  return key;
}

/** How deep the elements of lists stand. */
const depths: ReadonlyMap<string, number> = new Map([
  ["terms", 3],
  ["perturbations", 2],
]);
