/**
 * The words and signs of a formula with their places. The syntax tree carries no places, so what
 * is not allowed is refused here, where its position is known.
 */

export interface Token {
  readonly kind: "number" | "name" | "sign";
  readonly text: string;
  /** Character of the formula at which it starts, counting from 1. */
  readonly at: number;
}

/** A fault of a formula; `at` counts characters from 1. */
export interface FormulaFault {
  readonly code: string;
  readonly at: number;
  readonly message: string;
  readonly hint: string;
}

const maxLength = 2000;
const maxNesting = 100;

const pattern = /[ \t]+|((?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)|([A-Za-z][A-Za-z0-9_]*)|([-+*/^(),])/y;

/** Splits a formula into tokens, or says what does not belong there: foreign characters, too long, too deep. */
export function tokenise(text: string): Token[] | FormulaFault {
  if (text.length > maxLength) {
    const message = `the formula has ${text.length} characters; at most ${maxLength} are allowed`;
    return refuse("input.formula-long", maxLength + 1, message, "Split it into several terms.");
  }
  const tokens: Token[] = [];
  pattern.lastIndex = 0;
  while (pattern.lastIndex < text.length) {
    const at = pattern.lastIndex + 1;
    const match = pattern.exec(text);
    if (match === null) return foreign(text, at);
    const [, number, name, sign] = match;
    if (number !== undefined) tokens.push({ kind: "number", text: number, at });
    if (name !== undefined) tokens.push({ kind: "name", text: name, at });
    if (sign !== undefined) tokens.push({ kind: "sign", text: sign, at });
  }
  return tooDeep(tokens) ?? tokens;
}

/** Parentheses and rows of signs make the parser call itself: their depth is limited before it starts. */
function tooDeep(tokens: readonly Token[]): FormulaFault | null {
  let nesting = 0;
  let signs = 0;
  for (const { kind, text, at } of tokens) {
    if (text === "(") nesting++;
    if (text === ")") nesting--;
    signs = kind === "sign" ? signs + 1 : 0;
    if (nesting > maxNesting || signs > maxNesting) {
      const message = `the formula is nested deeper than ${maxNesting} levels`;
      return refuse("input.formula-long", at, message, "Remove needless parentheses or signs.");
    }
  }
  return null;
}

export function refuse(code: string, at: number, message: string, hint: string): FormulaFault {
  return { code, at, message, hint };
}

function foreign(text: string, at: number): FormulaFault {
  const found = JSON.stringify(String.fromCodePoint(text.codePointAt(at - 1) ?? 0));
  return refuse(
    "input.formula-refused",
    at,
    `${found} does not belong in a formula`,
    "Use numbers, names, + - * / ^, parentheses and the listed functions only; ^ is power.",
  );
}
