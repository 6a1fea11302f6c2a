import { readFileSync } from "node:fs";
import { compileFromFile } from "json-schema-to-typescript";
import { describe, expect, it } from "vitest";
import { loadSchema, SchemaChecker } from "../../src/problem/schema.js";

interface Part {
  readonly type?: unknown;
  readonly description?: unknown;
  readonly items?: unknown;
  readonly additionalProperties?: unknown;
  readonly propertyNames?: unknown;
  readonly properties?: object;
  readonly definitions?: object;
}
const isPart = (value: unknown): value is Part => typeof value === "object" && value !== null;

/** Every part of the schema that describes a value, with its address. */
function parts(part: unknown, at = "#"): [string, Part][] {
  if (!isPart(part)) return [];
  const maps = (["properties", "definitions"] as const).flatMap((key) =>
    Object.entries(part[key] ?? {}).flatMap(([name, child]) => parts(child, `${at}/${key}/${name}`)),
  );
  return [[at, part], ...maps, ...parts(part.items, `${at}/items`)];
}

describe("the schema", () => {
  const all = parts(loadSchema());

  it("and the types made from it are the same as those committed", async () => {
    const types = await compileFromFile("src/problem/problem.schema.json", { additionalProperties: false });
    expect(types).toBe(readFileSync("src/problem/problem-file.ts", "utf8"));
  });

  it("describes every property", () => {
    const named = all.filter(([at]) => /\/(properties|definitions)\/[^/]+$/.test(at));
    expect(named.length).toBeGreaterThan(60);
    expect(named.filter(([, part]) => typeof part.description !== "string").map(([at]) => at)).toEqual([]);
  });

  it("lets no object have unknown keys", () => {
    const objects = all.filter(([, part]) => part.type === "object");
    const open = objects.filter(
      ([, part]) => part.additionalProperties !== false && part.propertyNames === undefined,
    );
    expect(objects.length).toBeGreaterThan(15);
    expect(open.map(([at]) => at)).toEqual([]);
  });

  it("explains a faulty choice of forms by one fault at its place", () => {
    const check = (X: unknown) =>
      new SchemaChecker()
        .check({ format: "dampwright/1", matrices: { X }, terms: {} })
        .map(({ code, pointer }) => `${code} ${pointer}`);
    expect(check({ file: 3 })).toEqual(["input.type /matrices/X/file"]);
    expect(check({ outer: { left: [[1]], right: { columns: [[[1, "a"]]] } } })).toEqual([
      "input.value /matrices/X/outer/left/0",
      "input.type /matrices/X/outer/right/columns/0/0/1",
    ]);
    expect(check({ outer: { left: 3, right: [] } })).toEqual([
      "input.type /matrices/X/outer/left",
      "input.value /matrices/X/outer/right",
    ]);
    expect(check(null)).toEqual(["input.type /matrices/X"]);
  });
});
