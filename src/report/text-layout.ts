import { noBreak } from "./number-text.js";

/** Columns that a page of text has. */
export const pageWidth = 80;

const indent = "  ";

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

/** Labels at the left, their texts in one column beside them, wrapped to the page; rows without text are left out. */
export function labelledLines(rows: readonly (readonly [label: string, text: string])[]): string[] {
  const shown = rows.filter(([, text]) => text !== "");
  const width = Math.max(0, ...shown.map(([label]) => label.length)) + 2;
  return shown.flatMap(([label, text]) =>
    wrap(text, pageWidth - indent.length - width).map(
      (line, k) => indent + (k === 0 ? label : "").padEnd(width) + line,
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
