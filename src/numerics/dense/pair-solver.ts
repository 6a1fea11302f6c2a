/**
 * Solves 1×1 and 2×2 real systems shifted by a complex number,
 * (B − (re + i im) I) z = b, where a singular pivot is replaced by a small one.
 * The right-hand side stands in x + i y (y null: all real) and is overwritten.
 */
export class PairSolver {
  private readonly floor: number;
  private re = 0;
  private im = 0;
  private least = 0;
  private quotientRe = 0;
  private quotientIm = 0;

  /** @param floor - Smallest modulus that a pivot may have. */
  constructor(floor: number) {
    this.floor = floor;
  }

  /** Sets the shift; pivots below eps times its modulus count as singular from now on. */
  shift(re: number, im: number): void {
    this.re = re;
    this.im = im;
    this.least = Math.max(Number.EPSILON * (Math.abs(re) + Math.abs(im)), this.floor);
  }

  solveOne(b: number, x: Float64Array, y: Float64Array | null, j: number): void {
    const d = b - this.re;
    if (y === null) {
      x[j] /= Math.abs(d) < this.least ? this.least : d;
      return;
    }
    this.divide(x[j], y[j], d, -this.im);
    x[j] = this.quotientRe;
    y[j] = this.quotientIm;
  }

  /** [[a, b], [c, d]] shifted; the unknowns are entries j and j + 1. Elimination with the larger of column 1 as pivot. */
  solvePair(
    a: number,
    b: number,
    c: number,
    d: number,
    x: Float64Array,
    y: Float64Array | null,
    j: number,
  ): void {
    const sRe = a - this.re;
    const uRe = d - this.re;
    const sIm = -this.im;
    const r1Re = x[j];
    const r2Re = x[j + 1];
    const r1Im = y === null ? 0 : y[j];
    const r2Im = y === null ? 0 : y[j + 1];
    let z1Re: number;
    let z1Im: number;
    let z2Re: number;
    let z2Im: number;
    if (Math.abs(sRe) + Math.abs(sIm) >= Math.abs(c)) {
      // Row 2 − (c / s) row 1.
      this.divide(c, 0, sRe, sIm);
      const fRe = this.quotientRe;
      const fIm = this.quotientIm;
      this.divide(
        r2Re - (fRe * r1Re - fIm * r1Im),
        r2Im - (fRe * r1Im + fIm * r1Re),
        uRe - fRe * b,
        sIm - fIm * b,
      );
      z2Re = this.quotientRe;
      z2Im = this.quotientIm;
      this.divide(r1Re - b * z2Re, r1Im - b * z2Im, sRe, sIm);
      z1Re = this.quotientRe;
      z1Im = this.quotientIm;
    } else {
      // Row 1 − (s / c) row 2, c real and not zero.
      const fRe = sRe / c;
      const fIm = sIm / c;
      this.divide(
        r1Re - (fRe * r2Re - fIm * r2Im),
        r1Im - (fRe * r2Im + fIm * r2Re),
        b - (fRe * uRe - fIm * sIm),
        -(fRe * sIm + fIm * uRe),
      );
      z2Re = this.quotientRe;
      z2Im = this.quotientIm;
      z1Re = (r2Re - (uRe * z2Re - sIm * z2Im)) / c;
      z1Im = (r2Im - (uRe * z2Im + sIm * z2Re)) / c;
    }
    x[j] = z1Re;
    x[j + 1] = z2Re;
    if (y === null) return;
    y[j] = z1Im;
    y[j + 1] = z2Im;
  }

  // (xRe + i xIm) / (dRe + i dIm) by Smith's rule, with a divisor that is nearly zero replaced.
  private divide(xRe: number, xIm: number, dRe: number, dIm: number): void {
    if (Math.abs(dRe) + Math.abs(dIm) < this.least) {
      this.quotientRe = xRe / this.least;
      this.quotientIm = xIm / this.least;
    } else if (Math.abs(dRe) >= Math.abs(dIm)) {
      const ratio = dIm / dRe;
      const divisor = dRe + dIm * ratio;
      this.quotientRe = (xRe + xIm * ratio) / divisor;
      this.quotientIm = (xIm - xRe * ratio) / divisor;
    } else {
      const ratio = dRe / dIm;
      const divisor = dRe * ratio + dIm;
      this.quotientRe = (xRe * ratio + xIm) / divisor;
      this.quotientIm = (xIm * ratio - xRe) / divisor;
    }
  }
}
