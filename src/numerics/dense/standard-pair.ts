/** What `standardisePair` fills in: the standardised block and the rotation that made it. */
export interface StandardPair {
  a: number;
  b: number;
  c: number;
  d: number;
  cosine: number;
  sine: number;
}

/**
 * Turns [[a, b], [c, d]] by a rotation into standard Schur form: upper
 * triangular (c = 0) for real eigenvalues, else equal diagonal entries and
 * b c < 0. Overwrites `pair`; the turned block is G [[a, b], [c, d]] Gᵀ, G = [[cos, sin], [−sin, cos]].
 *
 * Source: Bai & Demmel, Linear Algebra Appl. 186, 1993, pp. 75–95.
 */
export function standardisePair(pair: StandardPair): void {
  const { a, b, c, d } = pair;
  pair.cosine = 1;
  pair.sine = 0;
  if (c === 0) return;
  if (b === 0) {
    pair.cosine = 0;
    pair.sine = 1;
    pair.a = d;
    pair.b = -c;
    pair.c = 0;
    pair.d = a;
    return;
  }
  if (a === d && b < 0 !== c < 0) return;
  const p = 0.5 * (a - d);
  const most = Math.max(Math.abs(b), Math.abs(c));
  const least = Math.min(Math.abs(b), Math.abs(c)) * (b < 0 === c < 0 ? 1 : -1);
  const scale = Math.max(Math.abs(p), most);
  const z = (p / scale) * p + (most / scale) * least;
  if (z >= 4 * Number.EPSILON) splitReal(pair, p, most, least, scale, z);
  else equaliseDiagonal(pair, p);
}

function splitReal(
  pair: StandardPair,
  p: number,
  most: number,
  least: number,
  scale: number,
  discriminant: number,
): void {
  const root = Math.sqrt(scale) * Math.sqrt(discriminant);
  const z = p + (p < 0 ? -root : root);
  const { b, c, d } = pair;
  const length = Math.hypot(c, z);
  pair.a = d + z;
  pair.d = d - (most / z) * least;
  pair.cosine = z / length;
  pair.sine = c / length;
  pair.b = b - c;
  pair.c = 0;
}

// Complex or nearly equal real eigenvalues.
function equaliseDiagonal(pair: StandardPair, p: number): void {
  const { a, b, c, d } = pair;
  const sigma = b + c;
  const length = Math.hypot(sigma, a - d);
  const cosine = Math.sqrt(0.5 * (1 + Math.abs(sigma) / length));
  const sine = -(p / (length * cosine)) * (sigma < 0 ? -1 : 1);
  const aa = a * cosine + b * sine;
  const bb = -a * sine + b * cosine;
  const cc = c * cosine + d * sine;
  const dd = -c * sine + d * cosine;
  const upper = bb * cosine + dd * sine;
  const lower = -aa * sine + cc * cosine;
  const mean = 0.5 * (aa * cosine + cc * sine + (-bb * sine + dd * cosine));
  pair.a = mean;
  pair.d = mean;
  pair.b = upper;
  pair.c = lower;
  pair.cosine = cosine;
  pair.sine = sine;
  if (lower === 0) return;
  if (upper === 0) {
    pair.b = -lower;
    pair.c = 0;
    pair.cosine = -sine;
    pair.sine = cosine;
  } else if (upper < 0 === lower < 0) {
    const rootB = Math.sqrt(Math.abs(upper));
    const rootC = Math.sqrt(Math.abs(lower));
    const shift = lower < 0 ? -rootB * rootC : rootB * rootC;
    const inverse = 1 / Math.sqrt(Math.abs(upper + lower));
    pair.a = mean + shift;
    pair.d = mean - shift;
    pair.b = upper - lower;
    pair.c = 0;
    pair.cosine = cosine * rootB * inverse - sine * rootC * inverse;
    pair.sine = cosine * rootC * inverse + sine * rootB * inverse;
  }
}
