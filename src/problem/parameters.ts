import type { ProblemDocument } from "./document.js";
import type { FaultList } from "./fault-list.js";
import { formulaWords, parseFormula } from "./formula.js";
import { pointerSegment } from "./json-text.js";
import type { Formula, OperatingParameter, Variable } from "./problem.js";
import { show } from "./schema.js";

/** The named values of a problem. */
export interface Parameters {
  readonly constants: ReadonlyMap<string, number>;
  readonly design: readonly Variable[];
  readonly envelope: readonly OperatingParameter[];
  /** Every name that was declared, sound or not. */
  readonly declared: ReadonlySet<string>;
  /** Constants, starts and nominal values of the sound ones. */
  readonly values: ReadonlyMap<string, number>;
}

/** Reads constants, design and envelope and checks names and ranges. */
export function readParameters({ content, declared }: ProblemDocument, faults: FaultList): Parameters {
  const blockOf = new Map<string, string>();
  for (const block of ["constants", "envelope", "design"] as const) {
    for (const name of declared[block]) {
      const at = `/${block}${pointerSegment(name)}`;
      checkWord(name, at, faults);
      const other = blockOf.get(name);
      if (other !== undefined) {
        const message = `the name "${name}" stands under ${other} already`;
        faults.add(
          "input.duplicate-name",
          at,
          message,
          "Names are unique across constants, envelope and design.",
        );
      }
      blockOf.set(name, block);
    }
  }
  const constants = new Map(Object.entries(content.constants ?? {}));
  const envelope = Object.entries(content.envelope ?? {}).map(
    ([
      name,
      {
        range: [low, high],
        nominal,
        unit,
      },
    ]) => {
      // Halves first: the sum of two large ends could overflow.
      const found = { name, low, high, nominal: nominal ?? low / 2 + high / 2, unit: unit ?? "" };
      checkRange(`/envelope/${name}`, found, "nominal", found.nominal, faults);
      return found;
    },
  );
  const design = Object.entries(content.design ?? {}).map(
    ([
      name,
      {
        range: [low, high],
        start,
        step,
        unit,
      },
    ]) => {
      const found = { name, low, high, start, step: step ?? null, unit: unit ?? "" };
      checkRange(`/design/${name}`, found, "start", start, faults);
      return found;
    },
  );
  const values = new Map(constants);
  for (const { name, nominal } of envelope) values.set(name, nominal);
  for (const { name, start } of design) values.set(name, start);
  return { constants, design, envelope, declared: new Set(blockOf.keys()), values };
}

function checkWord(name: string, at: string, faults: FaultList): void {
  if (!formulaWords.has(name) && !isObjectWord(name)) return;
  const message = `"${name}" cannot be a name: it has a meaning of its own`;
  faults.add("input.name", at, message, "Rename it.");
}

/**
 * Words such as `constructor` that every JavaScript object knows: a trap for scripts that read results.
 * Those that begin with _ are refused by the schema already.
 */
export function isObjectWord(name: string): boolean {
  return name in Object.prototype && !name.startsWith("_");
}

function checkRange(
  at: string,
  { low, high }: { readonly low: number; readonly high: number },
  key: "start" | "nominal",
  value: number,
  faults: FaultList,
): void {
  if (low > high) {
    const message = `the lowest value ${low} is above the highest, ${high}`;
    faults.add("input.range", `${at}/range`, message, "Write the range as [lowest, highest].");
  } else if (value < low || value > high) {
    const message = `${key} ${value} is outside the range [${low}, ${high}]`;
    faults.add("input.range", `${at}/${key}`, message, `Move ${key} inside the range, or widen the range.`);
  }
}

/**
 * Reads a formula of the file: its syntax, its names, and that it is finite at the start and nominal values.
 *
 * @returns null after adding a fault.
 */
export function readFormula(
  source: string | number,
  at: string,
  { declared, values }: Parameters,
  faults: FaultList,
): Formula | null {
  const { formula, faults: found } = parseFormula(source, declared);
  for (const fault of found) {
    const message = `character ${fault.at} of ${show(source)}: ${fault.message}`;
    faults.add(fault.code, at, message, fault.hint);
  }
  if (formula === null || !formula.names.every((name) => values.has(name))) return formula;
  const value = formula.evaluate(values);
  if (Number.isFinite(value)) return formula;
  const given = formula.names.map((name) => `${name} = ${values.get(name)}`).join(", ");
  const message = `${show(source)} is ${value}${given === "" ? "" : ` at ${given}`}; expected a finite number`;
  faults.add("input.formula-value", at, message, "Correct the formula or the values it starts from.");
  return null;
}
