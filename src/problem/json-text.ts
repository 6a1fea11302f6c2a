/**
 * Reads JSON and tells where it is wrong, which `JSON.parse` does not do reliably, and which keys
 * stand twice in one object, of which it keeps the last without a word.
 */

export interface JsonFault {
  readonly code: "input.json-syntax" | "input.duplicate-key";
  /** JSON pointer of the key; empty for a fault of syntax. */
  readonly pointer: string;
  /** Both from 1. */
  readonly line: number;
  readonly column: number;
  readonly message: string;
}

const deepest = 100;
const literals = /true|false|null|-?(?:0|[1-9]\d*)(?:\.\d+)?(?:[eE][+-]?\d+)?/y;

/** @returns the value and the duplicate keys, or only the first fault of syntax (`value` undefined). */
export function parseJson(text: string): { readonly value: unknown; readonly faults: readonly JsonFault[] } {
  const scan = new JsonScan(text);
  try {
    scan.document();
  } catch (error) {
    if (!(error instanceof JsonStop)) throw error;
    return { value: undefined, faults: [locate(text, scan.at, "input.json-syntax", "", error.message)] };
  }
  const faults = scan.duplicates.map(({ pointer, at, key }) =>
    locate(
      text,
      at,
      "input.duplicate-key",
      pointer,
      `the key ${JSON.stringify(key)} stands here a second time`,
    ),
  );
  return { value: JSON.parse(text), faults };
}

/** The part of `text` before `at` gives line and column. */
function locate(
  text: string,
  at: number,
  code: JsonFault["code"],
  pointer: string,
  message: string,
): JsonFault {
  const lines = text.slice(0, at).split("\n");
  return { code, pointer, line: lines.length, column: lines[lines.length - 1].length + 1, message };
}

/** One segment of a JSON pointer, escaped (RFC 6901). */
export function pointerSegment(key: string | number): string {
  return `/${String(key).replaceAll("~", "~0").replaceAll("/", "~1")}`;
}

class JsonStop extends Error {}

/** Walks the grammar of RFC 8259 without building anything. */
class JsonScan {
  at = 0;
  readonly duplicates: { readonly pointer: string; readonly at: number; readonly key: string }[] = [];
  private readonly text: string;

  constructor(text: string) {
    this.text = text;
  }

  document(): void {
    this.blank();
    this.value([]);
    this.blank();
    if (this.at < this.text.length) this.stop("the end of the file");
  }

  private value(path: readonly (string | number)[]): void {
    if (path.length > deepest)
      throw new JsonStop(`objects and lists are nested deeper than ${deepest} levels`);
    const c = this.text[this.at];
    if (c === "{") this.object(path);
    else if (c === "[") this.list(path);
    else if (c === '"') this.string();
    else this.literal();
  }

  private literal(): void {
    literals.lastIndex = this.at;
    if (!literals.test(this.text)) this.stop("a value");
    this.at = literals.lastIndex;
  }

  private object(path: readonly (string | number)[]): void {
    const seen = new Set<string>();
    this.at++;
    this.blank();
    if (this.take("}")) return;
    do {
      this.blank();
      if (this.text[this.at] !== '"') this.stop("a key in double quotes");
      const at = this.at;
      const key = this.string();
      if (seen.has(key))
        this.duplicates.push({ pointer: [...path, key].map(pointerSegment).join(""), at, key });
      seen.add(key);
      this.blank();
      if (!this.take(":")) this.stop('":"');
      this.blank();
      this.value([...path, key]);
      this.blank();
    } while (this.take(","));
    if (!this.take("}")) this.stop('"," or "}"');
  }

  private list(path: readonly (string | number)[]): void {
    this.at++;
    this.blank();
    if (this.take("]")) return;
    let index = 0;
    do {
      this.blank();
      this.value([...path, index++]);
      this.blank();
    } while (this.take(","));
    if (!this.take("]")) this.stop('"," or "]"');
  }

  private string(): string {
    const start = this.at++;
    for (;;) {
      const c = this.text.charCodeAt(this.at);
      if (Number.isNaN(c) || c < 32) this.stop('a closing "');
      if (c === 34) break;
      if (c === 92 && !/^(?:["\\/bfnrt]|u[0-9a-fA-F]{4})/.test(this.text.slice(++this.at, this.at + 5))) {
        this.stop('one of " \\ / b f n r t u after a backslash');
      }
      this.at++;
    }
    return JSON.parse(this.text.slice(start, ++this.at)) as string;
  }

  private take(sign: string): boolean {
    if (this.text[this.at] !== sign) return false;
    this.at++;
    return true;
  }

  private blank(): void {
    while (/[ \t\r\n]/.test(this.text[this.at] ?? "")) this.at++;
  }

  private stop(expected: string): never {
    const found = this.at < this.text.length ? JSON.stringify(this.text[this.at]) : "the end of the file";
    throw new JsonStop(`expected ${expected}, found ${found}`);
  }
}
