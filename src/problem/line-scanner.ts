const newline = 10;
const zero = 48;
/** 10^0 … 10^22: the powers of ten that are exact in double precision. */
const exactPowers = Float64Array.from({ length: 23 }, (_, k) => Number(`1e${k}`));
/** Below this a mantissa takes one more decimal digit and stays exact (2^53 = 9007199254740992). */
const roomForDigit = 900719925474099;

/**
 * Reads numbers out of bytes without making strings of them. Every line in `bytes` must end with a
 * line feed: that is what stops each scan, so no other bound is checked.
 */
export class LineScanner {
  bytes: Buffer = Buffer.alloc(0);
  at = 0;

  /** Moves to the next byte that is no blank on this line, and gives it. */
  skipBlanks(): number {
    let c = this.bytes[this.at];
    while (c === 32 || c === 9 || c === 13) c = this.bytes[++this.at];
    return c;
  }

  /** Moves behind the end of this line. */
  skipLine(): void {
    this.at = this.bytes.indexOf(newline, this.at) + 1;
  }

  /** Whether nothing but blanks is left on this line; if so, moves behind it. */
  endsLine(): boolean {
    if (this.skipBlanks() !== newline) return false;
    this.at++;
    return true;
  }

  /** A whole number ≥ 0, or −1 where none stands. May exceed any index: check the range. */
  index(): number {
    let c = this.skipBlanks() - zero;
    if (!(c >= 0 && c <= 9)) return -1;
    let value = 0;
    while (c >= 0 && c <= 9) {
      value = value * 10 + c;
      c = this.bytes[++this.at] - zero;
    }
    return isSpace(c + zero) ? value : -1;
  }

  /**
   * A real number, correctly rounded; NaN where none stands (also for "nan" and "inf").
   * Up to 15 digits with a small exponent are one exact division or product of exact doubles
   * (Clinger, PLDI 1990); anything harder is left to the engine.
   */
  // biome-ignore lint/complexity/noExcessiveCognitiveComplexity: one pass over the digits, split it would scan twice
  real(): number {
    const { bytes } = this;
    let c = this.skipBlanks();
    const start = this.at;
    let at = start;
    const negative = c === 45;
    if (c === 45 || c === 43) c = bytes[++at];
    let mantissa = 0;
    let exact = true;
    let scale = 0;
    const firstDigit = at;
    for (; c >= zero && c <= 57; c = bytes[++at]) {
      if (mantissa < roomForDigit) mantissa = mantissa * 10 + (c - zero);
      else exact = false;
    }
    let digits = at - firstDigit;
    if (c === 46) {
      const point = at;
      c = bytes[++at];
      for (; c >= zero && c <= 57; c = bytes[++at]) {
        if (mantissa < roomForDigit) {
          mantissa = mantissa * 10 + (c - zero);
          scale--;
        } else exact = false;
      }
      digits += at - point - 1;
    }
    this.at = at;
    if (digits === 0) return Number.NaN;
    if (isExponent(c)) scale += this.exponent();
    if (!isSpace(bytes[this.at])) return Number.NaN;
    if (!exact || scale > 22 || scale < -22) return this.fallback(start);
    const size = scale < 0 ? mantissa / exactPowers[-scale] : mantissa * exactPowers[scale];
    return negative ? -size : size;
  }

  /** The exponent behind e, E, or Fortran's d, D; NaN where its digits are missing. */
  private exponent(): number {
    let c = this.bytes[++this.at];
    const negative = c === 45;
    if (c === 45 || c === 43) c = this.bytes[++this.at];
    if (!(c >= zero && c <= 57)) return Number.NaN;
    let value = 0;
    for (; c >= zero && c <= 57; c = this.bytes[++this.at]) value = Math.min(value * 10 + (c - zero), 99999);
    return negative ? -value : value;
  }

  private fallback(start: number): number {
    return Number(this.bytes.toString("latin1", start, this.at).replace(/[dD]/, "e"));
  }
}

function isSpace(c: number): boolean {
  return c === 32 || c === newline || c === 9 || c === 13;
}

function isExponent(c: number): boolean {
  return c === 101 || c === 69 || c === 100 || c === 68;
}
