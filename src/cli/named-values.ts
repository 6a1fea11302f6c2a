import { readFile } from "node:fs/promises";
import { type Fault, InputError } from "../errors.js";
import { readingFault } from "../problem/matrix-market.js";
import { suggest } from "../problem/nearest.js";

/** A value given on the command line or in a result file, and where it stands there. */
export interface NamedValue {
  readonly name: string;
  readonly value: number;
  /** For messages: `--at` or `result.json /design/layer`. */
  readonly at: string;
  /** Typed by a person, who can only mean what can be bought; a result may hold a design between two steps. */
  readonly typed: boolean;
}

/** A design variable or an operating parameter. */
export interface Ranged {
  readonly name: string;
  readonly low: number;
  readonly high: number;
  readonly unit: string;
  /** Purchasable step counted from `low`; null or absent: any value. */
  readonly step?: number | null;
}

const decimal = /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i;

/**
 * Reads `name=value,…` lists; a name given twice keeps its last value, as a later option overrides an earlier.
 *
 * @throws InputError with every piece that is no assignment of a number.
 */
export function parseAssignments(lists: readonly string[], flag: string): NamedValue[] {
  const faults: Fault[] = [];
  const values = new Map<string, NamedValue>();
  for (const piece of lists.flatMap((list) => list.split(","))) {
    const [name, written, ...rest] = piece.split("=").map((part) => part.trim());
    const value = Number(written);
    if (name !== "" && decimal.test(written ?? "") && Number.isFinite(value) && rest.length === 0) {
      values.set(name, { name, value, at: flag, typed: true });
      continue;
    }
    const message = `"${piece.trim()}" is no assignment of a number`;
    const hint = "Write name=value, several with commas between them: friction=0.5,speed=12.";
    faults.push({ code: "input.assignment", at: flag, message, hint });
  }
  if (faults.length > 0) throw new InputError(faults);
  return [...values.values()];
}

/**
 * The design that a result file names.
 *
 * @throws InputError when the file cannot be read or holds no design.
 */
export async function readDesign(path: string): Promise<NamedValue[]> {
  const design = await readDesignBlock(path);
  const faults: Fault[] = [];
  const values = Object.entries(design).flatMap(([name, value]) => {
    const at = `${path} /design/${name}`;
    if (typeof value === "number") return [{ name, value, at, typed: false }];
    const message = `expected a number, found ${JSON.stringify(value)}`;
    faults.push({ code: "input.design-value", at, message, hint: "Write the value as a number." });
    return [];
  });
  if (faults.length > 0) throw new InputError(faults);
  return values;
}

async function readDesignBlock(path: string): Promise<object> {
  const text = await readFile(path, "utf8").catch((error: unknown) => {
    throw readingFault(error, path);
  });
  const hint = "Give a result.json that margin or tune has written.";
  let content: unknown;
  try {
    content = JSON.parse(text);
  } catch {
    throw InputError.of("input.json-syntax", path, "the file is not JSON", hint);
  }
  if (typeof content === "object" && content !== null && "design" in content) {
    const { design } = content;
    if (typeof design === "object" && design !== null && !Array.isArray(design)) return design;
  }
  throw InputError.of("input.design-missing", path, 'the file has no block "design"', hint);
}

/** Checks given values against what the problem declares: adds a fault for each name or value that is not allowed. */
export function resolveValues(
  given: readonly NamedValue[],
  declared: readonly Ranged[],
  what: string,
  faults: Fault[],
): Map<string, number> {
  const values = new Map<string, number>();
  for (const { name, value, at, typed } of given) {
    const known = declared.find((each) => each.name === name);
    if (known === undefined) {
      const names = declared.map((each) => each.name);
      const hint = names.length === 0 ? `The problem has no ${what}.` : suggest(name, names, what);
      faults.push({ code: "input.unknown-name", at, message: `no ${what} is called "${name}"`, hint });
    } else if (value < known.low || value > known.high) {
      const range = `[${known.low}, ${known.high}]${known.unit === "" ? "" : ` ${known.unit}`}`;
      const message = `${name} = ${value} is outside its range ${range}`;
      faults.push({
        code: "input.range",
        at,
        message,
        hint: "Stay in the range, or widen it in the problem file.",
      });
    } else {
      const near = typed ? stepsAround(known, value) : [];
      if (near.length === 0) values.set(name, value);
      else faults.push(offStep(known, value, near, at));
    }
  }
  return values;
}

/** The steps below and above a value, inside the range; none when it lies on a step. */
function stepsAround({ low, high, step }: Ranged, value: number): number[] {
  if (step === null || step === undefined) return [];
  const count = (value - low) / step;
  // Decimal steps such as 0.1 are not exact in binary.
  if (Math.abs(count - Math.round(count)) < 1e-6) return [];
  return [Math.floor(count), Math.ceil(count)]
    .map((k) => Number((low + k * step).toPrecision(12)))
    .filter((near) => near <= high);
}

function offStep({ name, step, unit }: Ranged, value: number, near: readonly number[], at: string): Fault {
  const label = unit === "" ? "" : ` ${unit}`;
  const message = `${name} = ${value} is not on its steps of ${step}${label}`;
  return { code: "input.step", at, message, hint: `Use ${near.join(" or ")}${label}.` };
}
