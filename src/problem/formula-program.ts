import { invariant } from "../errors.js";
import type { Formula } from "./problem.js";

/** One step of a formula in postfix order: push a number or a named value, or apply an operation. */
export type Step =
  | { readonly push: number }
  | { readonly name: string }
  | { readonly apply: Operation; readonly count: number };

export type Operation = "+" | "-" | "*" | "/" | "^" | "negate" | FunctionName;
export type FunctionName = UnaryName | "min" | "max";
type UnaryName = "sqrt" | "exp" | "log" | "log10" | "sin" | "cos" | "tan" | "atan" | "abs";
type Real = (x: number) => number;

/** The functions of one argument with their derivatives. */
const functions: Readonly<Record<UnaryName, { readonly value: Real; readonly slope: Real }>> = {
  sqrt: { value: Math.sqrt, slope: (x) => 0.5 / Math.sqrt(x) },
  exp: { value: Math.exp, slope: Math.exp },
  log: { value: Math.log, slope: (x) => 1 / x },
  log10: { value: Math.log10, slope: (x) => 1 / (x * Math.LN10) },
  sin: { value: Math.sin, slope: Math.cos },
  cos: { value: Math.cos, slope: (x) => -Math.sin(x) },
  tan: { value: Math.tan, slope: (x) => 1 / Math.cos(x) ** 2 },
  atan: { value: Math.atan, slope: (x) => 1 / (1 + x * x) },
  abs: { value: Math.abs, slope: Math.sign },
};

export const functionNames: readonly string[] = [...Object.keys(functions), "min", "max"];

export function isFunctionName(name: string): name is FunctionName {
  return functionNames.includes(name);
}

/** A value with its derivative with respect to the one name asked for. */
interface Dual {
  readonly x: number;
  readonly dx: number;
}

/** A formula from its postfix steps; evaluated with derivative by forward mode on the same steps. */
export function programFormula(text: string, steps: readonly Step[]): Formula {
  const names = [...new Set(steps.flatMap((step) => ("name" in step ? [step.name] : [])))];
  return {
    text,
    names,
    steps,
    evaluate: (values) => run(steps, values, null).x,
    derivative: (name, values) => (names.includes(name) ? run(steps, values, name).dx : 0),
  };
}

function run(steps: readonly Step[], values: ReadonlyMap<string, number>, seed: string | null): Dual {
  const stack: Dual[] = [];
  for (const step of steps) {
    if ("push" in step) stack.push({ x: step.push, dx: 0 });
    else if ("name" in step) stack.push(named(step.name, values, seed));
    else stack.push(apply(step.apply, stack.splice(stack.length - step.count)));
  }
  invariant(stack.length === 1, "a formula leaves one value");
  return stack[0];
}

function named(name: string, values: ReadonlyMap<string, number>, seed: string | null): Dual {
  const x = values.get(name);
  invariant(x !== undefined, `a value for "${name}" was not given to the formula`);
  return { x, dx: name === seed ? 1 : 0 };
}

function apply(operation: Operation, args: readonly Dual[]): Dual {
  const [a, b] = args;
  switch (operation) {
    case "+":
      return { x: a.x + b.x, dx: a.dx + b.dx };
    case "-":
      return { x: a.x - b.x, dx: a.dx - b.dx };
    case "*":
      return { x: a.x * b.x, dx: chain(b.x, a.dx) + chain(a.x, b.dx) };
    case "/":
      return { x: a.x / b.x, dx: chain(1 / b.x, a.dx) - chain(a.x / b.x / b.x, b.dx) };
    case "^":
      return power(a, b);
    case "negate":
      return { x: -a.x, dx: -a.dx };
    case "min":
      return args.reduce((best, next) => (next.x < best.x || Number.isNaN(next.x) ? next : best));
    case "max":
      return args.reduce((best, next) => (next.x > best.x || Number.isNaN(next.x) ? next : best));
    default: {
      const { value, slope } = functions[operation];
      return { x: value(a.x), dx: chain(slope(a.x), a.dx) };
    }
  }
}

/** slope·dx, and 0 for a constant even where the slope is infinite: ∞·0 would be NaN. */
function chain(slope: number, dx: number): number {
  return dx === 0 ? 0 : slope * dx;
}

/** u^v with d(u^v) = v·u^(v−1) du + u^v·ln u dv; the second part tends to 0 with u^v. */
function power(u: Dual, v: Dual): Dual {
  const x = u.x ** v.x;
  const byBase = v.x === 0 ? 0 : chain(v.x * u.x ** (v.x - 1), u.dx);
  const byExponent = x === 0 ? 0 : chain(x * Math.log(u.x), v.dx);
  return { x, dx: byBase + byExponent };
}
