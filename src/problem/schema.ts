import { readFileSync } from "node:fs";
import { Ajv, type ErrorObject, type ValidateFunction } from "ajv";
import { invariant } from "../errors.js";
import { pointerSegment } from "./json-text.js";
import { suggest } from "./nearest.js";

/** A part of the JSON Schema, as far as it is looked at here. */
interface SchemaPart {
  readonly $id?: string;
  readonly definitions?: Readonly<Record<string, SchemaPart>>;
  readonly description?: string;
  readonly type?: string | readonly string[];
  readonly properties?: Readonly<Record<string, SchemaPart>>;
  readonly required?: readonly string[];
  readonly anyOf?: readonly { readonly $ref: string }[];
  readonly minItems?: number;
  readonly maxItems?: number;
}

/** What the validator tells about a failed keyword. */
interface Params {
  readonly additionalProperty?: string;
  readonly propertyName?: string;
  readonly missingProperty?: string;
  readonly allowedValue?: string;
  readonly allowedValues?: readonly string[];
  readonly type?: string | readonly string[];
  readonly comparison?: string;
  readonly limit?: number;
}

/** A departure of a document from the schema. */
export interface SchemaFault {
  readonly code: string;
  readonly pointer: string;
  readonly message: string;
  readonly hint: string;
}

type Found = Omit<ErrorObject<string, Params>, "parentSchema"> & { readonly parentSchema?: SchemaPart };

const schemaUrl = new URL("./problem.schema.json", import.meta.url);
const definition = /^#\/definitions\/(\w+)$/;

/** The JSON Schema of problem files, as shipped with the package. */
export function loadSchema(): object {
  return JSON.parse(readFileSync(schemaUrl, "utf8")) as object;
}

/** Checks documents against the schema and says in our own words what is wrong. */
export class SchemaChecker {
  private readonly ajv = new Ajv({ allErrors: true, verbose: true, allowUnionTypes: true });
  private readonly schema: SchemaPart = loadSchema();

  constructor() {
    this.ajv.addSchema(this.schema);
  }

  /** @returns all faults, each place once; none for a document that keeps to the schema. */
  check(document: unknown): SchemaFault[] {
    return this.explain("", document, "");
  }

  /** Faults of `data` against one part of the schema, given by its address behind the id. */
  private explain(part: string, data: unknown, at: string): SchemaFault[] {
    const validate = this.validator(part);
    if (validate(data)) return [];
    const errors = (validate.errors ?? []) as Found[];
    // Below a choice of forms every form complains; the choice is explained as one, further down.
    const choices = errors.filter((error) => error.keyword === "anyOf");
    const outermost = choices.filter(
      (error) => !choices.some((other) => other !== error && isWithin(error, other)),
    );
    const plain = errors.filter((error) => !choices.some((choice) => isWithin(error, choice)));
    return [
      ...outermost.flatMap((error) => this.explainChoice(error, at)),
      ...plain.filter((error) => error.propertyName === undefined).map((error) => describe(error, at)),
    ];
  }

  private explainChoice(error: Found, at: string): SchemaFault[] {
    const place = at + error.instancePath;
    const forms = (error.parentSchema?.anyOf ?? []).map(({ $ref }) => $ref);
    const meant = forms.find((form) => looksLike(error.data, this.part(form)));
    if (meant !== undefined) return this.explain(meant, error.data, place);
    const message = `expected ${error.parentSchema?.description}, found ${show(error.data)}`;
    return [{ code: "input.type", pointer: place, message, hint: "Write it in one of these forms." }];
  }

  private validator(part: string): ValidateFunction {
    const validate = this.ajv.getSchema(`${this.schema.$id}${part}`);
    invariant(validate !== undefined, `the schema has a part ${part}`);
    return validate;
  }

  private part(ref: string): SchemaPart {
    const name = definition.exec(ref)?.[1] ?? "";
    const part = this.schema.definitions?.[name];
    invariant(part !== undefined, `the schema defines ${ref}`);
    return part;
  }
}

function isWithin(inner: Found, outer: Found): boolean {
  if (inner.instancePath === outer.instancePath) return inner.keyword !== "anyOf" || inner === outer;
  return inner.instancePath.startsWith(`${outer.instancePath}/`);
}

/** Whether `data` was probably meant to be of this form: its type, and for objects a key of it. */
function looksLike(data: unknown, form: SchemaPart): boolean {
  if (Array.isArray(data)) return form.type === "array";
  if (data === null || typeof data !== "object") return form.type === typeof data;
  if (form.type !== "object") return false;
  return (form.required ?? []).some((key) => Object.hasOwn(data, key));
}

function describe(error: Found, at: string): SchemaFault {
  const { keyword, params, parentSchema, data } = error;
  const pointer = at + error.instancePath;
  const about = parentSchema?.description ?? "";
  const value = (wanted: string, code = "input.value"): SchemaFault => ({
    code,
    pointer,
    message: `expected ${wanted}, found ${show(data)}`,
    hint: about === "" ? "Correct the value." : `It is: ${about}`,
  });
  switch (keyword) {
    case "additionalProperties":
      return unknownKey(
        pointer,
        String(params.additionalProperty),
        Object.keys(parentSchema?.properties ?? {}),
      );
    case "propertyNames":
      return badName(pointer, String(params.propertyName));
    case "required":
      return missingKey(pointer, String(params.missingProperty), parentSchema);
    case "const":
      return value(show(params.allowedValue), pointer === "/format" ? "input.format" : "input.value");
    case "enum":
      return {
        ...value(`one of ${(params.allowedValues ?? []).join(", ")}`),
        ...suggestValue(error),
      };
    case "type":
      return value([params.type ?? []].flat().map(typeName).join(" or "), "input.type");
    case "minItems":
    case "maxItems":
      return value(items(parentSchema));
    case "minLength":
      return value("a text that is not empty");
    case "maxLength":
      return value(`at most ${params.limit} characters`);
    case "pattern":
      return value("a text without control characters");
    default:
      return value(`a number ${params.comparison?.replace(">=", "≥").replace("<=", "≤")} ${params.limit}`);
  }
}

function suggestValue({ data, params }: Found): { hint: string } {
  return { hint: suggest(String(data), params.allowedValues ?? [], "value") };
}

function unknownKey(pointer: string, key: string, known: readonly string[]): SchemaFault {
  return {
    code: "input.unknown-key",
    pointer: pointer + pointerSegment(key),
    message: `the key ${show(key)} is not known here`,
    hint: suggest(key, known, "key"),
  };
}

function badName(pointer: string, name: string): SchemaFault {
  const message = `${show(name)} cannot be a name: a letter, then letters, digits and _, at most 80`;
  return { code: "input.name", pointer: pointer + pointerSegment(name), message, hint: "Rename it." };
}

function missingKey(pointer: string, key: string, parent: SchemaPart | undefined): SchemaFault {
  const about = parent?.properties?.[key]?.description;
  const hint = about === undefined ? `Add "${key}".` : `Add "${key}": ${about}`;
  return { code: "input.missing-key", pointer, message: `the key ${show(key)} is missing`, hint };
}

function items(parent: SchemaPart | undefined): string {
  const least = parent?.minItems;
  return parent?.maxItems === undefined ? `a list of at least ${least}` : `a list of ${least} values`;
}

function typeName(type: string): string {
  const names: Record<string, string> = { string: "a text", integer: "a whole number", array: "a list" };
  return names[type] ?? `a${type === "object" ? "n" : ""} ${type}`;
}

/** A value in a message, shortened. */
export function show(value: unknown): string {
  const text = typeof value === "number" ? String(value) : (JSON.stringify(value) ?? String(value));
  return text.length > 60 ? `${text.slice(0, 57)}…` : text;
}
