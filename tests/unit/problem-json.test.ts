import { describe, expect, it } from "vitest";
import { parseJson } from "../../src/problem/json-text.js";

describe("JSON text", () => {
  const texts = [
    '{"a":[1,-2.5e+3,"x\\u00e9\\n",true,null,{}],"b":{"c":[]}}',
    " [ ] ",
    '"\\\\\\""',
    "0",
    "-0.0e-0",
  ];

  it.each(texts)("%s has the value that the language gives it", (text) => {
    expect(parseJson(text)).toEqual({ value: JSON.parse(text), faults: [] });
  });

  it("is refused wherever the language refuses it, one character changed at a time", () => {
    const marks = [
      '"',
      "{",
      "}",
      "[",
      "]",
      ",",
      ":",
      "\\",
      "0",
      "1",
      ".",
      "-",
      "e",
      "t",
      " ",
      "\n",
      "\u0001",
      "",
    ];
    for (const text of texts) {
      for (let at = 0; at <= text.length; at++) {
        for (const mark of marks) {
          for (const changed of [
            text.slice(0, at) + mark + text.slice(at),
            text.slice(0, at) + mark + text.slice(at + 1),
          ]) {
            let sound = true;
            try {
              JSON.parse(changed);
            } catch {
              sound = false;
            }
            const refused = parseJson(changed).faults.some(({ code }) => code === "input.json-syntax");
            expect(refused, JSON.stringify(changed)).toBe(!sound);
          }
        }
      }
    }
  });

  it.each([
    ["", 1, 1],
    ["{", 1, 2],
    ['{"a":1,}', 1, 8],
    ['{\n"a":1\n"b":2}', 3, 1],
    ["[1,\n 2,\n x]", 3, 2],
    ['{"a":"b\n"}', 1, 8],
    ["{'a':1}", 1, 2],
    ["[01]", 1, 3],
    ["[1] 2", 1, 5],
  ])("%j is wrong at line %i, column %i", (text, line, column) => {
    const { faults } = parseJson(text);
    expect(faults).toMatchObject([{ code: "input.json-syntax", line, column }]);
  });

  it("tells keys that stand twice, also when written differently", () => {
    const { value, faults } = parseJson('{"x":[{"a/b":1,"a\\u002fb":2}],"x":3,\n"x":4}');
    expect(value).toEqual({ x: 4 });
    expect(faults.map(({ pointer, line }) => `${pointer} ${line}`)).toEqual(["/x/0/a~1b 1", "/x 1", "/x 2"]);
  });

  it("nested without end is refused before it exhausts the stack", () => {
    expect(parseJson("[".repeat(100_000)).faults[0]!.code).toBe("input.json-syntax");
  });
});
