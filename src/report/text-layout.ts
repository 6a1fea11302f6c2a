import { noBreak } from "./number-text.js";

/** Columns that a page of text has. */
export const pageWidth = 80;

const indent = "  ";
const labelWidth = 28;

/** Lines of at most `width` characters, broken at blanks only: a longer word stands alone and sticks out. */
export function wrap(text: string, width: number): string[] {
  const lines: string[] = [];
  for (const word of text.split(" ")) {
    const last = lines.at(-1);
    if (last !== undefined && last.length + 1 + word.length <= width)
      lines[lines.length - 1] = `${last} ${word}`;
    else lines.push(word);
  }
  return lines;
}

type Labelled = readonly (readonly [label: string, text: string])[];

/** Labels at the left, their texts in one column beside them, wrapped to the page; rows without text are left out. */
export function labelledLines(rows: Labelled): string[] {
  return labelledBlocks([rows])[0];
}

/** Several such blocks with one width for the labels of all. */
export function labelledBlocks(blocks: readonly Labelled[]): string[][] {
  const shown = blocks.map((rows) => rows.filter(([, text]) => text !== ""));
  const width = Math.max(0, ...shown.flat().map(([label]) => clip(label, labelWidth).length)) + 2;
  return shown.map((rows) => linesOf(rows, width));
}

function linesOf(rows: Labelled, width: number): string[] {
  return rows.flatMap(([label, text]) =>
    wrap(text, pageWidth - indent.length - width).map(
      (line, k) => indent + (k === 0 ? clip(label, labelWidth) : "").padEnd(width) + line,
    ),
  );
}

/** At most `width` characters: a longer name loses its end. */
export function clip(text: string, width: number): string {
  return text.length <= width ? text : `${text.slice(0, width - 1)}…`;
}

/** Cells in columns as wide as their widest cell, two blanks apart. */
export function columnLines(rows: readonly (readonly string[])[]): string[] {
  const columns = Math.max(0, ...rows.map((row) => row.length));
  const widths = Array.from({ length: columns }, (_, j) =>
    Math.max(...rows.map((row) => (row[j] ?? "").length)),
  );
  return rows.map((row) => (indent + row.map((cell, j) => cell.padEnd(widths[j] + 2)).join("")).trimEnd());
}

/**
 * Blocks of lines with an empty line between them; empty blocks are left out, no-break spaces made plain. Control
 * characters, which could come from a title and drive the reader's terminal, become spaces.
 */
export function page(blocks: readonly (readonly string[])[]): string {
  const shown = blocks.filter((block) => block.length > 0);
  const plain = (line: string): string => line.replace(/\p{Cc}/gu, " ").replaceAll(noBreak, " ");
  return `${shown.map((block) => block.map(plain).join("\n")).join("\n\n")}\n`;
}
