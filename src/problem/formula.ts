import { parse } from "mathjs/number";
import { invariant } from "../errors.js";
import {
  functionNames,
  isFunctionName,
  type Operation,
  programFormula,
  type Step,
} from "./formula-program.js";
import { type FormulaFault, refuse, type Token, tokenise } from "./formula-tokens.js";
import { suggest } from "./nearest.js";
import type { Formula } from "./problem.js";

export type ParsedFormula =
  | { readonly formula: Formula; readonly faults: readonly [] }
  | { readonly formula: null; readonly faults: readonly FormulaFault[] };

/** The parts of a syntax-tree node that the allowed kinds have. */
interface Node {
  readonly type: string;
  readonly value?: unknown;
  readonly name?: string;
  readonly op?: string;
  readonly fn?: string | { readonly name?: string };
  readonly args?: readonly Node[];
  readonly content?: Node;
}

const operators = new Set(["+", "-", "*", "/", "^"]);
/** Words that the parser does not read as names. */
const parserWords = ["mod", "to", "in", "and", "or", "xor", "not", "true", "false", "null", "undefined"];

/** Words that mean something in formulas and so cannot name a constant, variable or parameter. */
export const formulaWords: ReadonlySet<string> = new Set([
  ...functionNames,
  ...parserWords,
  "pi",
  "NaN",
  "Infinity",
  "end",
]);

/**
 * Reads a formula of + − * / ^, parentheses, the functions sqrt exp log log10 sin cos tan atan abs
 * min max and the constant pi. `^` is power and right-associative; −x^2 is −(x^2). Nothing of the text is ever
 * executed: the syntax tree is walked by an allow-list and compiled to a small postfix program.
 *
 * @param known - Names that may be used.
 * @returns the formula, or everything found wrong with it.
 */
export function parseFormula(source: string | number, known: Iterable<string>): ParsedFormula {
  const text = String(source);
  const tokens = tokenise(text);
  if (!Array.isArray(tokens)) return { formula: null, faults: [tokens] };
  const faults = [...checkOrder(tokens), ...checkNames(tokens, new Set(known))];
  if (faults.length > 0) return { formula: null, faults };
  try {
    const steps: Step[] = [];
    compileInto(steps, parse(text) as Node);
    return { formula: programFormula(text, steps), faults: [] };
  } catch (error) {
    if (!(error instanceof SyntaxError)) throw error;
    return { formula: null, faults: [syntaxFault(error, text)] };
  }
}

/** Refuses products without a sign ("2 x"), which a reader may take for a name or a call. */
function checkOrder(tokens: readonly Token[]): FormulaFault[] {
  if (tokens.length === 0) {
    return [refuse("input.formula-syntax", 1, "the formula is empty", "Write a number or a formula.")];
  }
  return tokens.flatMap((token, i) => {
    const before = tokens[i - 1];
    const endsOperand = before !== undefined && (before.kind !== "sign" || before.text === ")");
    const startsOperand = token.kind !== "sign" || token.text === "(";
    const isCall = token.text === "(" && before?.kind === "name";
    if (!endsOperand || !startsOperand || isCall) return [];
    const message = `expected a sign between "${before.text}" and "${token.text}"`;
    return [
      refuse(
        "input.formula-syntax",
        token.at,
        message,
        `Write "${before.text}*${token.text}" for a product.`,
      ),
    ];
  });
}

function checkNames(tokens: readonly Token[], known: ReadonlySet<string>): FormulaFault[] {
  const said = new Set<string>();
  return tokens.flatMap((token, i) => {
    const fault = token.kind === "name" ? checkName(token, tokens[i + 1], known) : null;
    if (fault === null || said.has(token.text)) return [];
    said.add(token.text);
    return [fault];
  });
}

function checkName(
  { text, at }: Token,
  next: Token | undefined,
  known: ReadonlySet<string>,
): FormulaFault | null {
  const called = next?.text === "(";
  if (isFunctionName(text)) {
    if (called) return null;
    return refuse(
      "input.formula-syntax",
      at,
      `"${text}" is a function and needs an argument`,
      `Write "${text}(…)".`,
    );
  }
  if (called) {
    const hint = known.has(text)
      ? `Write "${text}*(" for a product.`
      : suggest(text, functionNames, "function");
    return refuse("input.formula-name", at, `"${text}" is no function`, hint);
  }
  if (text === "pi" || known.has(text)) return null;
  const hint = suggest(text, [...known, "pi"], "constant, design variable or operating parameter");
  return refuse("input.formula-name", at, `nothing is called "${text}"`, hint);
}

function compileInto(steps: Step[], node: Node): void {
  const args = node.args ?? [];
  switch (node.type) {
    case "ConstantNode":
      invariant(typeof node.value === "number", "a constant is a number after tokenising");
      if (!Number.isFinite(node.value)) throw new SyntaxError("a number is too large for double precision");
      steps.push({ push: node.value });
      return;
    case "SymbolNode":
      invariant(node.name !== undefined, "a symbol has a name");
      steps.push(node.name === "pi" ? { push: Math.PI } : { name: node.name });
      return;
    case "ParenthesisNode":
      invariant(node.content !== undefined, "a parenthesis has content");
      compileInto(steps, node.content);
      return;
    case "OperatorNode":
    case "FunctionNode":
      for (const arg of args) compileInto(steps, arg);
      applyInto(steps, node, args.length);
      return;
    default:
      throw new SyntaxError(`a formula must not hold a ${node.type.replace(/Node$/, "").toLowerCase()}`);
  }
}

function applyInto(steps: Step[], node: Node, count: number): void {
  if (node.type === "OperatorNode") {
    invariant(node.op !== undefined && operators.has(node.op), `no operator ${node.op} after tokenising`);
    if (count === 2) steps.push({ apply: node.op as Operation, count });
    else if (node.op === "-") steps.push({ apply: "negate", count });
    return;
  }
  const name = typeof node.fn === "string" ? node.fn : (node.fn?.name ?? "");
  invariant(isFunctionName(name), `no function ${name} after tokenising`);
  const takesMany = name === "min" || name === "max";
  if (count === 0 || (count > 1 && !takesMany)) {
    throw new SyntaxError(
      `${name} takes ${takesMany ? "one or more arguments" : "one argument"}, ${count} given`,
    );
  }
  steps.push({ apply: name, count });
}

function syntaxFault(error: SyntaxError & { char?: number }, text: string): FormulaFault {
  const message = error.message.replace(/ \(char \d+\)$/, "");
  const at = Math.min(error.char ?? 1, text.length);
  return refuse("input.formula-syntax", at, message, "Check signs, commas and parentheses.");
}
