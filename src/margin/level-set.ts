import { type DenseMatrix, zeros } from "../numerics/dense/matrix.js";
import { quadraticEigenvalues } from "../numerics/dense/quadratic-eigen.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import type { Band } from "./band.js";

/**
 * Frequencies ω ≥ 0 at which some singular value of H(iω) equals `level`: the imaginary
 * eigenvalues of the even quadratic pencil
 *
 *     [ P(s)        −B(s)B(−s)ᵀ/level ]
 *     [ −CᵀC/level   P(−s)ᵀ           ]
 *
 * where damping-like columns bring s: B(s)B(−s)ᵀ = B₀B₀ᵀ − s²B₁B₁ᵀ. Only crossings inside the band
 * are returned. `nearAxis` is generous on purpose: where two crossings are about to merge their
 * pair is imaginary to √eps only, and the caller samples between crossings anyway.
 *
 * Source: Boyd & Balakrishnan, Systems & Control Letters 15 (1990); Bruinsma & Steinbuch, ibid. 14 (1990).
 */
export function levelCrossings(
  pencil: DensePencil,
  level: number,
  shift: number,
  band: Band,
  nearAxis = 1e-5,
): number[] {
  const { massMatrix, velocityMatrix, displacementMatrix, inputMatrix, outputTransposedMatrix, powers } =
    pencil;
  const n = pencil.order;
  const m = zeros(2 * n, 2 * n);
  const c = zeros(2 * n, 2 * n);
  const s = zeros(2 * n, 2 * n);
  placeWithAdjoint(m, massMatrix, 1);
  placeWithAdjoint(c, velocityMatrix, -1);
  placeWithAdjoint(s, displacementMatrix, 1);
  addOuter(s, inputMatrix, powers, 0, -1 / level, 0, n);
  addOuter(m, inputMatrix, powers, 1, 1 / level, 0, n);
  addOuter(s, outputTransposedMatrix, new Uint8Array(outputTransposedMatrix.cols), 0, -1 / level, n, 0);
  const { re, im } = quadraticEigenvalues(m, c, s, shift);
  const crossings: number[] = [];
  for (let j = 0; j < re.length; j++) {
    if (im[j] < 0 || !Number.isFinite(re[j])) continue;
    if (Math.abs(re[j]) > nearAxis * Math.max(im[j], 1e-3 * shift)) continue;
    if (im[j] >= band.low && im[j] <= band.high) crossings.push(im[j]);
  }
  return crossings.sort((a, b) => a - b);
}

/** A on the upper diagonal block, sign·Aᵀ on the lower one. */
function placeWithAdjoint(target: DenseMatrix, a: DenseMatrix, sign: number): void {
  const n = a.rows;
  for (let j = 0; j < n; j++) {
    for (let i = 0; i < n; i++) {
      target.values[i + j * 2 * n] = a.values[i + j * n];
      target.values[n + i + (n + j) * 2 * n] = sign * a.values[j + i * n];
    }
  }
}

/** Adds α Σ b_k b_kᵀ over the columns with the given power, at block offset (row, col). */
function addOuter(
  target: DenseMatrix,
  b: DenseMatrix,
  powers: Uint8Array,
  power: number,
  alpha: number,
  row: number,
  col: number,
): void {
  const n = b.rows;
  for (let k = 0; k < b.cols; k++) {
    if (powers[k] !== power) continue;
    const from = k * n;
    for (let j = 0; j < n; j++) {
      const scaled = alpha * b.values[from + j];
      if (scaled === 0) continue;
      for (let i = 0; i < n; i++)
        target.values[row + i + (col + j) * target.rows] += b.values[from + i] * scaled;
    }
  }
}
