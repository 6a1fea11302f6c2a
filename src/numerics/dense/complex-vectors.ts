import type { ComplexVector } from "./matrix.js";

/** Euclidean norm, scaled against overflow only by the range of doubles. */
export function norm2(x: ComplexVector): number {
  const { re, im } = x;
  let sum = 0;
  for (let i = 0; i < re.length; i++) sum += re[i] * re[i] + im[i] * im[i];
  return Math.sqrt(sum);
}

/** The two parts of yᴴ x. */
export function innerProduct(y: ComplexVector, x: ComplexVector): { re: number; im: number } {
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  let re = 0;
  let im = 0;
  for (let i = 0; i < xRe.length; i++) {
    re += yRe[i] * xRe[i] + yIm[i] * xIm[i];
    im += yRe[i] * xIm[i] - yIm[i] * xRe[i];
  }
  return { re, im };
}

/** x ← (cRe + i cIm) x. */
export function scaleInPlace(x: ComplexVector, cRe: number, cIm: number): void {
  const { re, im } = x;
  for (let i = 0; i < re.length; i++) {
    const a = re[i];
    re[i] = cRe * a - cIm * im[i];
    im[i] = cRe * im[i] + cIm * a;
  }
}

/** y ← y + (cRe + i cIm) x. */
export function addScaledInto(y: ComplexVector, cRe: number, cIm: number, x: ComplexVector): void {
  const { re: yRe, im: yIm } = y;
  const { re: xRe, im: xIm } = x;
  for (let i = 0; i < xRe.length; i++) {
    yRe[i] += cRe * xRe[i] - cIm * xIm[i];
    yIm[i] += cRe * xIm[i] + cIm * xRe[i];
  }
}

export function copyOf(x: ComplexVector): ComplexVector {
  return { re: x.re.slice(), im: x.im.slice() };
}

/** x ← x / ‖x‖₂; a zero vector stays zero. Returns the norm it had. */
export function normaliseInPlace(x: ComplexVector): number {
  const norm = norm2(x);
  if (norm > 0) scaleInPlace(x, 1 / norm, 0);
  return norm;
}
