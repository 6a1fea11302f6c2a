import { describe, expect, it } from "vitest";
import { parseFormula } from "../../src/problem/formula.js";
import type { Formula } from "../../src/problem/problem.js";

const known = ["x", "y", "layer", "friction", "e", "i"];

function formula(text: string | number): Formula {
  const parsed = parseFormula(text, known);
  if (parsed.formula === null) throw new Error(`${text}: ${JSON.stringify(parsed.faults)}`);
  return parsed.formula;
}
const at = (values: Record<string, number>) => new Map(Object.entries(values));
const codesOf = (text: string) => parseFormula(text, known).faults.map((fault) => fault.code);

function random(seed: number): () => number {
  let state = seed;
  return () => {
    state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
    return state / 2 ** 32;
  };
}

describe("a formula", () => {
  it.each([
    ["1 + 2*3", 7],
    ["-x^2", -4],
    ["2^3^2", 512],
    ["2^-x", 0.25],
    ["-2^-x", -0.25],
    ["8/4/2", 1],
    ["1-2-3", -4],
    ["--x", 2],
    ["+x - -y", 5],
    ["(x + y)*x", 10],
    ["1e3*.5 + 2.", 502],
    ["pi", Math.PI],
    ["sqrt(x*8) + exp(0) + log(1) + log10(1000)", 8],
    ["sin(0) + cos(0) + tan(0) + atan(0)", 1],
    ["abs(-y) + min(x, y, 1) + max(x, y)", 7],
    ["min(x)", 2],
    [2.5e-7, 2.5e-7],
    [-3, -3],
    ["e*i", 20],
  ])("%s has the value of its textbook reading", (text, value) => {
    expect(formula(text).evaluate(at({ x: 2, y: 3, e: 4, i: 5 }))).toBe(value);
  });

  it("tells its names once, in order", () => {
    expect(formula("y*x + y^2 + pi").names).toEqual(["y", "x"]);
    expect(formula("layer").text).toBe("layer");
  });

  it("is not finite where it is undefined", () => {
    expect(formula("1/x").evaluate(at({ x: 0 }))).toBe(Number.POSITIVE_INFINITY);
    expect(formula("log(x)").evaluate(at({ x: -1 }))).toBeNaN();
    expect(formula("min(1, log(x))").evaluate(at({ x: -1 }))).toBeNaN();
    expect(formula("max(log(x), 1)").evaluate(at({ x: -1 }))).toBeNaN();
  });

  it("differentiates exactly, at kinks and singular constants too", () => {
    const slope = (text: string, values: Record<string, number>) => formula(text).derivative("x", at(values));
    expect(slope("x^3", { x: 2 })).toBe(12);
    expect(slope("x^0 + 0^(x + 1)", { x: 0 })).toBe(0);
    expect(slope("x^1", { x: 0 })).toBe(1);
    expect(slope("x*sqrt(y)", { x: 1, y: 0 })).toBe(0);
    expect(slope("y^2", { x: 1, y: 0 })).toBe(0);
    expect(slope("2^x", { x: 3 })).toBeCloseTo(8 * Math.LN2, 14);
    expect(slope("abs(x) + min(x, 5) + max(x, 5)", { x: -1 })).toBe(0);
    expect(slope("(-2)^x", { x: 2 })).toBeNaN();
  });

  it("has the derivative that differences find", () => {
    const next = random(11);
    const leaves = ["x", "y", "1.7", "pi"];
    const calls = ["exp", "sin", "cos", "atan", "abs", "tan"];
    const grow = (depth: number): string => {
      const pick = Math.floor(next() * 8);
      if (depth === 0 || pick === 0) return leaves[Math.floor(next() * leaves.length)]!;
      if (pick < 4) return `(${grow(depth - 1)} ${"+-*"[pick - 1]} ${grow(depth - 1)})`;
      if (pick === 4) return `${grow(depth - 1)}/(2 + (${grow(depth - 1)})^2)`;
      if (pick === 5) return `sqrt(1 + (${grow(depth - 1)})^2)`;
      if (pick === 6) return `(1 + abs(${grow(depth - 1)}))^-1.5`;
      return `${calls[Math.floor(next() * calls.length)]}(sin(${grow(depth - 1)}))`;
    };
    for (let k = 0; k < 200; k++) {
      const text = grow(4);
      const f = formula(text);
      const [x, y, h] = [0.3 + next(), 0.4 + next(), 1e-5];
      const value = (d: number) => f.evaluate(at({ x: x + d, y }));
      const fine = (value(h) - value(-h)) / (2 * h);
      const coarse = (value(2 * h) - value(-2 * h)) / (4 * h);
      // The two differences disagree by 3 h²/6 f''' and by the rounding ε|f|/h.
      const allowed = 3 * Math.abs(fine - coarse) + 1e-9 * (1 + Math.abs(value(0)) + Math.abs(fine));
      expect(Math.abs(f.derivative("x", at({ x, y })) - fine), text).toBeLessThanOrEqual(allowed);
    }
  });

  it("needs a value for each of its names", () => {
    expect(() => formula("x").evaluate(new Map())).toThrow("invariant");
  });
});

describe("refused", () => {
  it.each([
    ["", "input.formula-syntax"],
    ["  ", "input.formula-syntax"],
    ["2 x", "input.formula-syntax"],
    ["2(x)", "input.formula-syntax"],
    ["(x)(y)", "input.formula-syntax"],
    ["1.5.2", "input.formula-syntax"],
    ["0x1F", "input.formula-syntax"],
    ["2ex", "input.formula-syntax"],
    ["x +", "input.formula-syntax"],
    ["(x", "input.formula-syntax"],
    ["x)", "input.formula-syntax"],
    ["()", "input.formula-syntax"],
    ["x,y", "input.formula-syntax"],
    ["(x,y)", "input.formula-syntax"],
    ["max()", "input.formula-syntax"],
    ["max(x,)", "input.formula-syntax"],
    ["sqrt(x,y)", "input.formula-syntax"],
    ["sqrt", "input.formula-syntax"],
    ["x*/y", "input.formula-syntax"],
    ["1e999", "input.formula-syntax"],
    ["a.b", "input.formula-refused"],
    ["x.constructor", "input.formula-refused"],
    ["x[1]", "input.formula-refused"],
    ["x=3", "input.formula-refused"],
    ["f(x)=2", "input.formula-refused"],
    ["x;y", "input.formula-refused"],
    ["x\ny", "input.formula-refused"],
    ["x?1:2", "input.formula-refused"],
    ['"a"', "input.formula-refused"],
    ["x'", "input.formula-refused"],
    ["x!", "input.formula-refused"],
    ["x%2", "input.formula-refused"],
    ["x ./ 2", "input.formula-refused"],
    ["x**2", "input.formula-syntax"],
    ["x # note", "input.formula-refused"],
    ["x > 2", "input.formula-refused"],
    ["{x: 1}", "input.formula-refused"],
    ["π", "input.formula-refused"],
    ["_x", "input.formula-refused"],
    ["__proto__", "input.formula-refused"],
    ["constructor", "input.formula-name"],
    ["toString", "input.formula-name"],
    ["hasOwnProperty", "input.formula-name"],
    ["hasOwnProperty(x)", "input.formula-name"],
    ["true", "input.formula-name"],
    ["Infinity", "input.formula-name"],
    ["NaN", "input.formula-name"],
    ["evaluate(x)", "input.formula-name"],
    ["import(x)", "input.formula-name"],
    ["gamma(x)", "input.formula-name"],
    ["x(2)", "input.formula-name"],
    ["pi(2)", "input.formula-name"],
    ["speed", "input.formula-name"],
    ["x + ".repeat(600), "input.formula-long"],
    [`${"(".repeat(101)}x${")".repeat(101)}`, "input.formula-long"],
    [`${"-".repeat(1500)}x`, "input.formula-long"],
    [`${"abs(".repeat(101)}x${")".repeat(101)}`, "input.formula-long"],
  ])("is %j", (text, code) => {
    expect(codesOf(text)[0]).toBe(code);
  });

  it("are products of words, whatever the words mean to a parser", () => {
    for (const text of ["x mod y", "x to y", "x and y", "not x", "2 in 3"]) {
      expect(codesOf(text)).toContain("input.formula-syntax");
    }
  });

  it("tells the place of each unknown name, once, and what was meant", () => {
    const { faults } = parseFormula("lyer*x + frction + lyer", known);
    expect(faults.map((fault) => fault.at)).toEqual([1, 10]);
    expect(faults.map((fault) => fault.hint)).toEqual(['Did you mean "layer"?', 'Did you mean "friction"?']);
  });

  it("is nothing that 100 levels and 2000 characters allow", () => {
    expect(formula(`${"(".repeat(100)}x${")".repeat(100)}`).evaluate(at({ x: 7 }))).toBe(7);
    expect(formula(`x${"+x".repeat(999)}`).evaluate(at({ x: 1 }))).toBe(1000);
    expect(formula(`x${"+(x)".repeat(150)}`).evaluate(at({ x: 1 }))).toBe(151);
    expect(formula(`x${"^x".repeat(999)}`).evaluate(at({ x: 1 }))).toBe(1);
  });

  it("is any text without a stranger error than a fault", () => {
    const next = random(5);
    const pieces = [
      "x",
      "y",
      "2",
      "1e5",
      "+",
      "-",
      "*",
      "/",
      "^",
      "(",
      ")",
      ",",
      "sqrt",
      "max",
      "pi",
      " ",
      ".",
      "log(",
    ];
    for (let k = 0; k < 5000; k++) {
      const text = Array.from(
        { length: 1 + Math.floor(next() * 9) },
        () => pieces[Math.floor(next() * pieces.length)],
      );
      const { formula: f, faults } = parseFormula(text.join(""), known);
      expect(f === null).toBe(faults.length > 0);
      if (f !== null) expect(typeof f.evaluate(at({ x: 2, y: 3 }))).toBe("number");
    }
  });
});
