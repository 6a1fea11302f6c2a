import type { Outcome, Row } from "./row.js";

export interface NamedOutcome {
  readonly name: string;
  readonly outcome: Outcome;
  /** Whether it solves the same task as the first row, so that ratios to that mean something. */
  readonly comparable: boolean;
}

const headings = [
  "",
  "ordering s",
  "factor s",
  "spread",
  "÷ ours",
  "solve 1 ms",
  "÷ ours",
  "solve 12 ms",
  "÷ ours",
  "memory MB",
  "resident MB",
  "÷ ours",
  "LU fill M",
  "Gflop",
  "Gflop/s",
  "backward error",
  "",
];

/** Aligned lines, one a solver; those that could not run say why. */
export function solverTable(rows: readonly NamedOutcome[]): string {
  const base = rows.flatMap(({ outcome }) => ("absent" in outcome ? [] : [outcome]))[0];
  return aligned([headings, ...rows.map((row) => cells(row, base))]);
}

function cells({ name, outcome, comparable }: NamedOutcome, base: Row | undefined): string[] {
  if ("absent" in outcome) return [name, `absent: ${outcome.absent}`];
  const ratio = (value: (row: Row) => number): string =>
    comparable && base !== undefined ? (value(outcome) / value(base)).toFixed(2) : "";
  const least = (row: Row): number => Math.min(...row.factorS);
  const factor = least(outcome);
  return [
    name,
    outcome.orderingS === null ? "in factor" : outcome.orderingS.toFixed(3),
    factor.toFixed(3),
    outcome.factorS.length > 1
      ? `+${Math.round(100 * (Math.max(...outcome.factorS) / factor - 1))} %`
      : "one run",
    ratio(least),
    (1000 * outcome.solveOneS).toFixed(1),
    ratio((row) => row.solveOneS),
    (1000 * outcome.solveBlockS).toFixed(1),
    ratio((row) => row.solveBlockS),
    outcome.bytes === null ? "not told" : (outcome.bytes / 1e6).toFixed(0),
    (outcome.residentBytes / 1e6).toFixed(0),
    ratio((row) => row.residentBytes),
    (outcome.stored / 1e6).toFixed(2),
    (outcome.operations / 1e9).toFixed(1),
    (outcome.operations / 1e9 / factor).toFixed(1),
    outcome.backwardError.toExponential(1),
    outcome.remark,
  ];
}

/** First and last column to the left, the rest to the right; a line of two cells keeps its second as it is. The first line has all columns. */
export function aligned(lines: readonly (readonly string[])[]): string {
  const full = lines.filter((line) => line.length > 2);
  const width = lines[0].map((_, c) => Math.max(...full.map((line) => line[c]?.length ?? 0)));
  const pad = (cell: string, c: number, last: number): string =>
    c === 0 ? cell.padEnd(width[0]) : c === last || last === 1 ? cell : cell.padStart(width[c]);
  return lines
    .map((line) =>
      line
        .map((cell, c) => pad(cell, c, line.length - 1))
        .join("  ")
        .trimEnd(),
    )
    .map((line) => `${line}\n`)
    .join("");
}
