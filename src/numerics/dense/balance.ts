const sweepLimit = 40;

/**
 * Balances A in place: A ← D⁻¹ A D with D diagonal, of powers of two, such that
 * row i and column i without their diagonal entry get nearly equal 2-norms.
 * Exact, and worth many digits for matrices that mix units.
 *
 * @param re - A, n×n by columns.
 * @param im - Imaginary parts, or null for a real matrix.
 * @returns the diagonal of D, length n.
 *
 * Source: Parlett & Reinsch, Numer. Math. 13, 1969, pp. 293–304; the 2-norm
 * after James, Langou & Lowery, arXiv:1401.5766, 2014.
 */
export function balance(re: Float64Array, im: Float64Array | null, n: number): Float64Array {
  const scale = new Float64Array(n).fill(1);
  let settled = false;
  for (let sweep = 0; !settled && sweep < sweepLimit; sweep++) {
    settled = true;
    for (let i = 0; i < n; i++) {
      const factor = balancingFactor(re, im, n, i);
      // The bounds keep D and its inverse far from overflow when a matrix is nearly reducible.
      const next = scale[i] * factor;
      if (factor === 1 || next > 2 ** 400 || next < 2 ** -400) continue;
      settled = false;
      scale[i] = next;
      scaleRowAndColumn(re, n, i, factor);
      if (im !== null) scaleRowAndColumn(im, n, i, factor);
    }
  }
  return scale;
}

function balancingFactor(re: Float64Array, im: Float64Array | null, n: number, i: number): number {
  let col = 0;
  let row = 0;
  for (let j = 0; j < n; j++) {
    if (j === i) continue;
    const down = re[j + i * n];
    const across = re[i + j * n];
    col += down * down;
    row += across * across;
    if (im === null) continue;
    col += im[j + i * n] * im[j + i * n];
    row += im[i + j * n] * im[i + j * n];
  }
  if (!(col > 0 && row > 0)) return 1;
  const c = Math.sqrt(col);
  const r = Math.sqrt(row);
  const factor = 2 ** Math.round(Math.log2(r / c) / 2);
  return c * factor + r / factor < 0.95 * (c + r) ? factor : 1;
}

function scaleRowAndColumn(x: Float64Array, n: number, i: number, factor: number): void {
  const inverse = 1 / factor;
  for (let j = 0; j < n; j++) x[i + j * n] *= inverse;
  for (let j = i * n; j < (i + 1) * n; j++) x[j] *= factor;
}
