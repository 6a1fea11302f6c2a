import { type ComplexMatrix, complexZeros } from "../numerics/dense/matrix.js";
import { complexMultiply } from "../numerics/dense/products.js";
import { type QuadraticEigen, quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import type { DensePencil } from "../reduction/reduced-model.js";

/**
 * H(s) in pole–residue form, one frequency in O(poles · p · m):
 *
 *     H(iω) = Σ_j  R_j / (1 − (iω − s₀) θ_j)  · (iω)^k per column,   R_j = C x_j z_j B
 *
 * Only poles with Im λ ≥ 0 are kept; their conjugates follow because P is real.
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
  /** ‖R_j‖_F. */
  readonly residueNorm: Float64Array;
}

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
  const poles = Int32Array.from(Array.from(eigen.re.keys()).filter((j) => eigen.im[j] >= 0));
  const r = complexMultiply(realTransposed(outputTransposedMatrix), eigen.right);
  const q = complexMultiply(eigen.left, asComplex(inputMatrix));

  const size = outputs * inputs;
  const residueRe = new Float64Array(size * poles.length);
  const residueIm = new Float64Array(size * poles.length);
  const residueNorm = new Float64Array(poles.length);
  const rows = q.rows;
  poles.forEach((j, slot) => {
    let sum = 0;
    for (let k = 0, t = slot * size; k < inputs; k++) {
      const qRe = q.re[j + k * rows];
      const qIm = q.im[j + k * rows];
      for (let i = 0; i < outputs; i++, t++) {
        const rRe = r.re[i + j * outputs];
        const rIm = r.im[i + j * outputs];
        residueRe[t] = rRe * qRe - rIm * qIm;
        residueIm[t] = rRe * qIm + rIm * qRe;
        sum += residueRe[t] * residueRe[t] + residueIm[t] * residueIm[t];
      }
    }
    residueNorm[slot] = Math.sqrt(sum);
  });
  const form = { eigen, outputs, inputs, powers, poles, residueRe, residueIm, residueNorm };
  dropUnseenAxisPoles(form);
  return form;
}

/** H(iω), written into `h` (p×m). A pole that lies exactly at iω gives an infinite gain. */
export function transferInto(h: ComplexMatrix, form: SpectralForm, omega: number): void {
  const { eigen, outputs, inputs, powers, poles, residueRe, residueIm, residueNorm } = form;
  const { shift, thetaRe, thetaIm } = eigen;
  const size = outputs * inputs;
  const hRe = h.re;
  const hIm = h.im;
  hRe.fill(0);
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

/** Largest |contribution| of one pole at its own frequency, a cheap estimate of its peak. */
export function ownPeak(form: SpectralForm, slot: number): number {
  const { eigen, poles, residueNorm } = form;
  const j = poles[slot];
  const tr = eigen.thetaRe[j];
  const ti = eigen.thetaIm[j];
  const omega = Math.max(0, eigen.im[j]);
  const distance = Math.hypot(1 + eigen.shift * tr + omega * ti, eigen.shift * ti - omega * tr);
  const power = form.powers.some((k) => k === 1) ? Math.max(1, omega) : 1;
  return (power * residueNorm[slot]) / distance;
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
  const { eigen, poles, residueNorm, residueRe, residueIm, outputs, inputs } = form;
  const largest = residueNorm.reduce((high, norm) => Math.max(high, norm), 0);
  poles.forEach((j, slot) => {
    const near = Math.abs(eigen.re[j]) <= onAxis * Math.max(eigen.shift, eigen.im[j]);
    if (!near || residueNorm[slot] > unseen * largest) return;
    residueNorm[slot] = 0;
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
