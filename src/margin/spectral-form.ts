import { factorDense } from "../numerics/dense/lu.js";
import { type ComplexMatrix, complexZeros } from "../numerics/dense/matrix.js";
import { complexMultiply, multiplyTransposed } from "../numerics/dense/products.js";
import { type QuadraticEigen, quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { type Band, inBand } from "./band.js";

/**
 * H(s) in pole–residue form, one frequency in O(poles · p · m):
 *
 *     H(iω) = Σ_j  R_j / (1 − (iω − s₀) θ_j)  · (iω)^k per column,   R_j = C x_j z_j B
 *
 * Only finite poles with Im λ ≥ 0 are kept; their conjugates follow because P is real, and infinite ones (massless
 * dofs) are one constant, C P(s₀)⁻¹B less the finite residues: their own vectors may be defective.
 */
export interface SpectralForm {
  readonly eigen: QuadraticEigen;
  readonly outputs: number;
  readonly inputs: number;
  readonly powers: Uint8Array;
  /** Index into `eigen` of each kept pole. */
  readonly poles: Int32Array;
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
}

/** Relative error of the sum, met at one trial frequency, from which on the pencil is solved instead. */
const worstSum = 1e-9;

/** Relative distance from the axis below which a pole counts as lying on it. */
const onAxis = 1e-11;
/** Residue, relative to the largest, below which a pole counts as not seen by B and C. */
const unseen = 1e-9;

export function spectralForm(pencil: DensePencil, shift: number): SpectralForm {
  const { massMatrix, velocityMatrix, displacementMatrix, inputMatrix, outputTransposedMatrix, powers } =
    pencil;
  const eigen = quadraticEigen(massMatrix, velocityMatrix, displacementMatrix, shift);
  const outputs = outputTransposedMatrix.cols;
  const inputs = inputMatrix.cols;
  const poles = Int32Array.from(
    Array.from(eigen.re.keys()).filter((j) => eigen.im[j] >= 0 && Number.isFinite(eigen.re[j])),
  );
  const r = complexMultiply(realTransposed(outputTransposedMatrix), eigen.right);
  const q = complexMultiply(eigen.left, asComplex(inputMatrix));

  const size = outputs * inputs;
  const residueRe = new Float64Array(size * poles.length);
  const residueIm = new Float64Array(size * poles.length);
  const residueNorm = new Float64Array(poles.length);
  const inertNorm = new Float64Array(poles.length);
  const rows = q.rows;
  poles.forEach((j, slot) => {
    let sum = 0;
    let inert = 0;
    for (let k = 0, t = slot * size; k < inputs; k++) {
      const qRe = q.re[j + k * rows];
      const qIm = q.im[j + k * rows];
      for (let i = 0; i < outputs; i++, t++) {
        const rRe = r.re[i + j * outputs];
        const rIm = r.im[i + j * outputs];
        residueRe[t] = rRe * qRe - rIm * qIm;
        residueIm[t] = rRe * qIm + rIm * qRe;
        const square = residueRe[t] * residueRe[t] + residueIm[t] * residueIm[t];
        sum += square;
        if (powers[k] === 0) inert += square;
      }
    }
    residueNorm[slot] = Math.sqrt(sum);
    inertNorm[slot] = Math.sqrt(inert);
  });
  const isRegular = eigen.re.every((value) => Number.isFinite(value));
  const constant = isRegular ? new Float64Array(size) : constantPart(pencil, eigen, poles, residueRe);
  const form: SpectralForm = {
    eigen,
    constant,
    direct: null,
    outputs,
    inputs,
    powers,
    poles,
    residueRe,
    residueIm,
    residueNorm,
    inertNorm,
  };
  dropUnseenAxisPoles(form);
  return eigen.defective || !sumHolds(form, pencil) ? { ...form, direct: pencil } : form;
}

/** Compares the sum with a solve near the pole with the largest residue: there cancellation is worst. */
function sumHolds(form: SpectralForm, pencil: DensePencil): boolean {
  const { eigen, poles, residueNorm, outputs, inputs } = form;
  if (poles.length === 0 || outputs === 0 || inputs === 0) return true;
  const slot = residueNorm.indexOf(residueNorm.reduce((high, norm) => Math.max(high, norm), 0));
  const omega = 1.1 * Math.hypot(eigen.re[poles[slot]], eigen.im[poles[slot]]) + 0.1 * eigen.shift;
  const [sum, solved] = [complexZeros(outputs, inputs), complexZeros(outputs, inputs)];
  transferInto(sum, form, omega);
  solveInto(solved, pencil, omega);
  let [error, size] = [0, 0];
  for (let t = 0; t < sum.re.length; t++) {
    error = Math.max(error, Math.hypot(sum.re[t] - solved.re[t], sum.im[t] - solved.im[t]));
    size = Math.max(size, Math.hypot(solved.re[t], solved.im[t]));
  }
  return error <= worstSum * size;
}

/** C P(iω)⁻¹ B diag((iω)^k) by a solve. */
function solveInto(h: ComplexMatrix, pencil: DensePencil, omega: number): void {
  const { inputMatrix, outputTransposedMatrix, powers } = pencil;
  const responses = asComplex({ ...inputMatrix, values: inputMatrix.values.slice() });
  pencil.factor(0, omega).solveInPlace(responses);
  const outputs = complexMultiply(realTransposed(outputTransposedMatrix), responses);
  h.re.set(outputs.re);
  h.im.set(outputs.im);
  applyPowers(h.re, h.im, h.rows, powers, omega);
}

/** C P(s₀)⁻¹ B, where every term of the sum stands at its residue, less the finite poles and their conjugates. */
function constantPart(
  pencil: DensePencil,
  eigen: QuadraticEigen,
  poles: Int32Array,
  residueRe: Float64Array,
): Float64Array {
  const { massMatrix, velocityMatrix, displacementMatrix, inputMatrix, outputTransposedMatrix } = pencil;
  const s = eigen.shift;
  const values = displacementMatrix.values.map(
    (value, q) => value + s * (velocityMatrix.values[q] + s * massMatrix.values[q]),
  );
  const responses = { ...inputMatrix, values: inputMatrix.values.slice() };
  factorDense({ ...massMatrix, values }).solveInPlace(responses);
  const { values: constant } = multiplyTransposed(outputTransposedMatrix, responses);
  const size = constant.length;
  poles.forEach((j, slot) => {
    const times = eigen.im[j] === 0 ? 1 : 2;
    for (let t = 0; t < size; t++) constant[t] -= times * residueRe[slot * size + t];
  });
  return constant;
}

/** H(iω), written into `h` (p×m). A pole that lies exactly at iω gives an infinite gain. */
export function transferInto(h: ComplexMatrix, form: SpectralForm, omega: number): void {
  if (form.direct !== null) {
    solveInto(h, form.direct, omega);
    return;
  }
  const { eigen, outputs, inputs, powers, poles, residueRe, residueIm, residueNorm } = form;
  const { shift, thetaRe, thetaIm } = eigen;
  const size = outputs * inputs;
  const hRe = h.re;
  const hIm = h.im;
  hRe.set(form.constant);
  hIm.fill(0);
  for (let slot = 0; slot < poles.length; slot++) {
    if (residueNorm[slot] === 0) continue;
    const tr = thetaRe[poles[slot]];
    const ti = thetaIm[poles[slot]];
    // 1/(1 − (iω − s₀)θ), and the same for the conjugate pole.
    const dRe = 1 + shift * tr + omega * ti;
    const dIm = shift * ti - omega * tr;
    const d2 = dRe * dRe + dIm * dIm;
    const aRe = dRe / d2;
    const aIm = -dIm / d2;
    let sumRe = aRe;
    let sumIm = aIm;
    let differenceRe = aRe;
    let differenceIm = aIm;
    if (eigen.im[poles[slot]] !== 0) {
      const eRe = 1 + shift * tr - omega * ti;
      const eIm = -shift * ti - omega * tr;
      const e2 = eRe * eRe + eIm * eIm;
      sumRe += eRe / e2;
      sumIm -= eIm / e2;
      differenceRe -= eRe / e2;
      differenceIm += eIm / e2;
    }
    for (let t = 0, from = slot * size; t < size; t++) {
      const fRe = residueRe[from + t];
      const fIm = residueIm[from + t];
      hRe[t] += sumRe * fRe - differenceIm * fIm;
      hIm[t] += sumIm * fRe + differenceRe * fIm;
    }
  }
  applyPowers(hRe, hIm, outputs, powers, omega);
}

/**
 * Largest |contribution| of one pole at its own frequency, a cheap estimate of its peak: Im λ for stiffness-like
 * columns, |λ| (where an overdamped mode answers most) for the factor ω of damping-like ones.
 */
export function ownPeak(form: SpectralForm, slot: number): number {
  const { eigen, poles, residueNorm, inertNorm } = form;
  const j = poles[slot];
  const tr = eigen.thetaRe[j];
  const ti = eigen.thetaIm[j];
  const omega = Math.max(0, eigen.im[j]);
  const distance = Math.hypot(1 + eigen.shift * tr + omega * ti, eigen.shift * ti - omega * tr);
  const stiff = inertNorm[slot];
  const viscous2 = Math.max(0, residueNorm[slot] ** 2 - stiff ** 2);
  return Math.hypot(stiff, Math.hypot(eigen.re[j], omega) * Math.sqrt(viscous2)) / distance;
}

/**
 * Index of a finite pole in the band that lies on the axis and is seen by B and C: there the gain is infinite. One
 * at s = 0 counts when S is singular to rounding, for a creeping mode is no rigid one. −1 when there is none.
 */
export function poleOnAxis(form: SpectralForm, pencil: DensePencil, band: Band): number {
  const { eigen, poles, residueNorm } = form;
  const { shift } = eigen;
  const slot = poles.findIndex((j, k) => {
    const [re, im] = [eigen.re[j], eigen.im[j]];
    if (!(residueNorm[k] > 0) || !inBand(band, im)) return false;
    if (Math.hypot(re, im) < 1e-5 * shift)
      return !(factorDense(pencil.displacementMatrix).pivotRatio > 1e-14);
    return Math.abs(re) <= onAxis * im;
  });
  return slot < 0 ? -1 : poles[slot];
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
 * An undamped mode that B and C do not see has a residue of rounding errors over a distance of
 * rounding errors: a gain of pure noise. Its residue is zero by declaration.
 */
function dropUnseenAxisPoles(form: SpectralForm): void {
  const { eigen, poles, residueNorm, inertNorm, residueRe, residueIm, outputs, inputs } = form;
  const largest = residueNorm.reduce((high, norm) => Math.max(high, norm), 0);
  poles.forEach((j, slot) => {
    const near = Math.abs(eigen.re[j]) <= onAxis * Math.max(eigen.shift, eigen.im[j]);
    if (!near || residueNorm[slot] > unseen * largest) return;
    residueNorm[slot] = 0;
    inertNorm[slot] = 0;
    residueRe.fill(0, slot * outputs * inputs, (slot + 1) * outputs * inputs);
    residueIm.fill(0, slot * outputs * inputs, (slot + 1) * outputs * inputs);
  });
}

function asComplex(a: { rows: number; cols: number; values: Float64Array }): ComplexMatrix {
  return { rows: a.rows, cols: a.cols, re: a.values, im: new Float64Array(a.values.length) };
}

function realTransposed(a: { rows: number; cols: number; values: Float64Array }): ComplexMatrix {
  const out = complexZeros(a.cols, a.rows);
  for (let j = 0; j < a.cols; j++)
    for (let i = 0; i < a.rows; i++) out.re[j + i * a.cols] = a.values[i + j * a.rows];
  return out;
}
