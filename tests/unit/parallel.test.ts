import { describe, expect, it } from "vitest";
import { alone } from "../../src/parallel/crew.js";
import { revive, shared } from "../../src/parallel/share.js";

describe("shared", () => {
  it("moves arrays of numbers into shared memory and keeps everything else", () => {
    const matrix = {
      rows: 2,
      values: Float64Array.of(1, 2),
      index: Int32Array.of(3),
      flags: Uint8Array.of(1),
    };
    const data = { matrix, list: [matrix, { name: "a" }], map: new Map([["m", matrix]]), set: new Set([4]) };
    const copy = shared(data);
    expect(copy).toEqual(data);
    for (const array of [copy.matrix.values, copy.matrix.index, copy.matrix.flags]) {
      expect(array.buffer).toBeInstanceOf(SharedArrayBuffer);
    }
    expect(data.matrix.values.buffer).toBeInstanceOf(ArrayBuffer);
  });

  it("keeps one object one object", () => {
    const matrix = { values: Float64Array.of(1) };
    const copy = shared({ a: matrix, b: [matrix], c: new Map([["m", matrix]]) });
    expect(copy.b[0]).toBe(copy.a);
    expect(copy.c.get("m")).toBe(copy.a);
  });

  it("is seen by whoever received a clone", () => {
    const copy = shared({ values: Float64Array.of(1) });
    const received = structuredClone(copy);
    received.values[0] = 7;
    expect(copy.values[0]).toBe(7);
  });

  it("sends stand-ins for what cannot be exchanged, which `revive` puts back everywhere", () => {
    const square = { evaluate: (x: number) => x * x, power: 2 };
    const data = { terms: [{ factor: square }], named: new Map([["f", square]]), plain: { power: 3 } };
    const sent = structuredClone(
      shared(data, (value) =>
        "evaluate" in value ? { standsFor: (value as typeof square).power } : undefined,
      ),
    );
    const back = revive(sent, (value) =>
      "standsFor" in value ? { evaluate: (x: number) => x ** (value.standsFor as number) } : undefined,
    );
    expect(back.terms[0]!.factor.evaluate(3)).toBe(9);
    expect(back.named.get("f")!.evaluate(4)).toBe(16);
    expect(back.plain).toEqual({ power: 3 });
  });
});

describe("a crew of one", () => {
  const crew = alone<number, { add: (held: number, x: number) => Promise<number> }>(
    { add: async (held, x) => held + x },
    10,
  );

  it("answers in the order of the questions and tells after each", async () => {
    let finished = 0;
    expect(
      await crew.run("add", [3, 1, 2], () => {
        finished++;
      }),
    ).toEqual([13, 11, 12]);
    expect(finished).toBe(3);
    expect(await crew.run("add", [])).toEqual([]);
  });
});
