/** The frequencies that count, in rad/s; `high` is Infinity when all do. */
export interface Band {
  readonly low: number;
  readonly high: number;
}

export function bandOf(bandHz: readonly [number, number] | null): Band {
  return bandHz === null
    ? { low: 0, high: Number.POSITIVE_INFINITY }
    : { low: 2 * Math.PI * bandHz[0], high: 2 * Math.PI * bandHz[1] };
}

/** Whether an eigenvalue with this imaginary part is judged; real ones only where the band includes 0. */
export function inBand(band: Band, imaginary: number): boolean {
  const omega = Math.abs(imaginary);
  return omega >= band.low && omega <= band.high;
}
