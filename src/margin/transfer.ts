import { type ComplexMatrix, complexZeros, type DenseMatrix } from "../numerics/dense/matrix.js";
import { complexMultiplyAdjoint } from "../numerics/dense/products.js";
import type { QuadraticPoles } from "../numerics/dense/quadratic-companion.js";
import type { DensePencil } from "../reduction/reduced-model.js";

/**
 * H(s) in pole–residue form, one frequency in O(poles · p · m):
 *
 *     H(iω) = Σ_j  R_j / (1 − (iω − s₀) θ_j)  · (iω)^k per column,   R_j = C x_j z_j B
 *
 * Only finite poles with Im λ ≥ 0 are kept; their conjugates follow because P is real, and infinite ones (massless
 * dofs) are one constant, C P(s₀)⁻¹B less the finite residues: their own vectors may be defective.
 */
export interface SpectralForm {
  readonly poles: QuadraticPoles;
  readonly outputs: number;
  readonly inputs: number;
  readonly powers: Uint8Array;
  /** Index into `poles` of each kept pole. */
  readonly kept: Int32Array;
  /** R_j one after the other, each p×m column-major. */
  readonly residueRe: Float64Array;
  readonly residueIm: Float64Array;
  /** What the infinite poles add to C P⁻¹B, p×m: a constant. */
  readonly constant: Float64Array;
  /** The pencil itself, to be solved anew at each frequency, where (nearly) defective poles spoil the sum; else null. */
  readonly direct: DensePencil | null;
  /** ‖R_j‖_F. */
  readonly residueNorm: Float64Array;
  /** The same over the stiffness-like columns alone. */
  readonly inertNorm: Float64Array;
  /** Workspace of `transferInto`, four numbers a kept pole. */
  readonly weights: Float64Array;
}

/** H(iω), written into `h` (p×m). A pole that lies exactly at iω gives an infinite gain. */
export function transferInto(h: ComplexMatrix, form: SpectralForm, omega: number): void {
  if (form.direct !== null) {
    solveInto(h, form.direct, omega);
    return;
  }
  setWeights(form, omega);
  h.re.set(form.constant);
  h.im.fill(0);
  let slot = 0;
  for (; slot + 1 < form.kept.length; slot += 2) addTwoPoles(h, form, slot);
  if (slot < form.kept.length) addPole(h, form, slot);
  applyPowers(h.re, h.im, form.outputs, form.powers, omega);
}

/** With a = 1/(1 − (iω − s₀)θ) and ã the same for the conjugate pole, a + ã and a − ã; both a for a real pole. */
function setWeights({ poles, kept, residueNorm, weights }: SpectralForm, omega: number): void {
  const { shift, thetaRe, thetaIm } = poles;
  for (let slot = 0; slot < kept.length; slot++) {
    const w = 4 * slot;
    if (residueNorm[slot] === 0) {
      weights.fill(0, w, w + 4);
      continue;
    }
    const tr = thetaRe[kept[slot]];
    const ti = thetaIm[kept[slot]];
    const dRe = 1 + shift * tr + omega * ti;
    const dIm = shift * ti - omega * tr;
    const d2 = dRe * dRe + dIm * dIm;
    const aRe = dRe / d2;
    const aIm = -dIm / d2;
    let eRe = 0;
    let eIm = 0;
    if (poles.im[kept[slot]] !== 0) {
      const cRe = 1 + shift * tr - omega * ti;
      const cIm = -shift * ti - omega * tr;
      const c2 = cRe * cRe + cIm * cIm;
      eRe = cRe / c2;
      eIm = -cIm / c2;
    }
    weights[w] = aRe + eRe;
    weights[w + 1] = aIm + eIm;
    weights[w + 2] = aRe - eRe;
    weights[w + 3] = aIm - eIm;
  }
}

/** aR + ãR̄ = (a + ã) Re R + i (a − ã) Im R, for two poles at once: half the passes over h. */
function addTwoPoles(h: ComplexMatrix, form: SpectralForm, slot: number): void {
  const { weights, residueRe, residueIm } = form;
  const { re, im } = h;
  const w = 4 * slot;
  const sumRe = weights[w];
  const sumIm = weights[w + 1];
  const differenceRe = weights[w + 2];
  const differenceIm = weights[w + 3];
  const nextSumRe = weights[w + 4];
  const nextSumIm = weights[w + 5];
  const nextDifferenceRe = weights[w + 6];
  const nextDifferenceIm = weights[w + 7];
  const size = re.length;
  const from = slot * size;
  const next = from + size;
  for (let t = 0; t < size; t++) {
    const fRe = residueRe[from + t];
    const fIm = residueIm[from + t];
    const gRe = residueRe[next + t];
    const gIm = residueIm[next + t];
    re[t] += sumRe * fRe - differenceIm * fIm + (nextSumRe * gRe - nextDifferenceIm * gIm);
    im[t] += sumIm * fRe + differenceRe * fIm + (nextSumIm * gRe + nextDifferenceRe * gIm);
  }
}

function addPole(h: ComplexMatrix, form: SpectralForm, slot: number): void {
  const { weights, residueRe, residueIm } = form;
  const { re, im } = h;
  const sumRe = weights[4 * slot];
  const sumIm = weights[4 * slot + 1];
  const differenceRe = weights[4 * slot + 2];
  const differenceIm = weights[4 * slot + 3];
  const from = slot * re.length;
  for (let t = 0; t < re.length; t++) {
    const fRe = residueRe[from + t];
    const fIm = residueIm[from + t];
    re[t] += sumRe * fRe - differenceIm * fIm;
    im[t] += sumIm * fRe + differenceRe * fIm;
  }
}

/** C P(iω)⁻¹ B diag((iω)^k) by a solve. */
export function solveInto(h: ComplexMatrix, pencil: DensePencil, omega: number): void {
  const { inputMatrix, outputTransposedMatrix, powers } = pencil;
  const responses = { ...complexZeros(inputMatrix.rows, inputMatrix.cols), re: inputMatrix.values.slice() };
  pencil.factor(0, omega).solveInPlace(responses);
  const outputs = complexMultiplyAdjoint(asComplex(outputTransposedMatrix), responses);
  h.re.set(outputs.re);
  h.im.set(outputs.im);
  applyPowers(h.re, h.im, h.rows, powers, omega);
}

function applyPowers(
  hRe: Float64Array,
  hIm: Float64Array,
  rows: number,
  powers: Uint8Array,
  omega: number,
): void {
  for (let k = 0; k < powers.length; k++) {
    if (powers[k] === 0) continue;
    for (let t = k * rows; t < (k + 1) * rows; t++) {
      const re = hRe[t];
      hRe[t] = -omega * hIm[t];
      hIm[t] = omega * re;
    }
  }
}

/**
 * Largest |contribution| of one pole at its own frequency, a cheap estimate of its peak: Im λ for stiffness-like
 * columns, |λ| (where an overdamped mode answers most) for the factor ω of damping-like ones.
 */
export function ownPeak(form: SpectralForm, slot: number): number {
  const { poles, kept, residueNorm, inertNorm } = form;
  const j = kept[slot];
  const tr = poles.thetaRe[j];
  const ti = poles.thetaIm[j];
  const omega = Math.max(0, poles.im[j]);
  const distance = Math.hypot(1 + poles.shift * tr + omega * ti, poles.shift * ti - omega * tr);
  const stiff = inertNorm[slot];
  const viscous2 = Math.max(0, residueNorm[slot] ** 2 - stiff ** 2);
  return Math.hypot(stiff, Math.hypot(poles.re[j], omega) * Math.sqrt(viscous2)) / distance;
}

function asComplex(a: DenseMatrix): ComplexMatrix {
  return { rows: a.rows, cols: a.cols, re: a.values, im: new Float64Array(a.values.length) };
}
