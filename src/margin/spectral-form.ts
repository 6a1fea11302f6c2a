import { factorDense } from "../numerics/dense/lu.js";
import { type ComplexMatrix, complexZeros, type DenseMatrix } from "../numerics/dense/matrix.js";
import { complexMultiply, complexMultiplyAdjoint, multiplyTransposed } from "../numerics/dense/products.js";
import type { QuadraticPoles } from "../numerics/dense/quadratic-companion.js";
import { quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import { type QuadraticFactors, quadraticFactors } from "../numerics/dense/quadratic-factors.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { type Band, inBand } from "./band.js";
import { type SpectralForm, solveInto, transferInto } from "./transfer.js";

/** Relative error of the sum, met at one trial frequency, from which on the pencil is solved instead. */
const worstSum = 1e-9;

/** Relative distance from the axis below which a pole counts as lying on it. */
const onAxis = 1e-11;
/** Residue, relative to the largest, below which a pole counts as not seen by B and C. */
const unseen = 1e-9;

/**
 * The pole–residue form of a pencil: from the contracted eigenvectors where that sum holds, else from the eigenvectors
 * themselves, matched within clusters, else without a sum.
 */
export function spectralForm(pencil: DensePencil, shift: number): SpectralForm {
  const { massMatrix, velocityMatrix, displacementMatrix, inputMatrix, outputTransposedMatrix } = pencil;
  const quick = formFrom(
    pencil,
    quadraticFactors(
      massMatrix,
      velocityMatrix,
      displacementMatrix,
      shift,
      inputMatrix,
      outputTransposedMatrix,
    ),
  );
  if (isRegular(quick.poles) && sumHolds(quick, pencil)) return quick;
  const eigen = quadraticEigen(massMatrix, velocityMatrix, displacementMatrix, shift);
  const form = formFrom(pencil, {
    ...eigen,
    outputs: complexMultiplyAdjoint(asComplex(outputTransposedMatrix), eigen.right),
    inputs: complexMultiply(eigen.left, asComplex(inputMatrix)),
  });
  return eigen.defective || !sumHolds(form, pencil) ? { ...form, direct: pencil } : form;
}

/** Whether all poles are finite. */
function isRegular(poles: QuadraticPoles): boolean {
  return poles.re.every((value) => Number.isFinite(value));
}

function formFrom(pencil: DensePencil, factors: QuadraticFactors): SpectralForm {
  const kept = Int32Array.from(
    Array.from(factors.re.keys()).filter((j) => factors.im[j] >= 0 && Number.isFinite(factors.re[j])),
  );
  const residues = residuesOf(factors, kept, pencil.powers);
  const form: SpectralForm = {
    poles: factors,
    outputs: factors.outputs.rows,
    inputs: factors.inputs.cols,
    powers: pencil.powers,
    kept,
    ...residues,
    constant: isRegular(factors)
      ? new Float64Array(factors.outputs.rows * factors.inputs.cols)
      : constantPart(pencil, factors, kept, residues.residueRe),
    direct: null,
    weights: new Float64Array(4 * kept.length),
  };
  dropUnseenAxisPoles(form);
  return form;
}

/** R_j = (C x_j)(z_j B) and its norms. */
function residuesOf(
  { outputs: r, inputs: q }: QuadraticFactors,
  kept: Int32Array,
  powers: Uint8Array,
): Pick<SpectralForm, "residueRe" | "residueIm" | "residueNorm" | "inertNorm"> {
  const [outputs, inputs, rows] = [r.rows, q.cols, q.rows];
  const residueRe = new Float64Array(outputs * inputs * kept.length);
  const residueIm = new Float64Array(outputs * inputs * kept.length);
  const residueNorm = new Float64Array(kept.length);
  const inertNorm = new Float64Array(kept.length);
  for (let slot = 0, t = 0; slot < kept.length; slot++) {
    const j = kept[slot];
    let sum = 0;
    let inert = 0;
    for (let k = 0; k < inputs; k++) {
      const qRe = q.re[j + k * rows];
      const qIm = q.im[j + k * rows];
      for (let i = j * outputs; i < (j + 1) * outputs; i++, t++) {
        residueRe[t] = r.re[i] * qRe - r.im[i] * qIm;
        residueIm[t] = r.re[i] * qIm + r.im[i] * qRe;
        const square = residueRe[t] * residueRe[t] + residueIm[t] * residueIm[t];
        sum += square;
        if (powers[k] === 0) inert += square;
      }
    }
    residueNorm[slot] = Math.sqrt(sum);
    inertNorm[slot] = Math.sqrt(inert);
  }
  return { residueRe, residueIm, residueNorm, inertNorm };
}

/** Compares the sum with a solve near the pole with the largest residue: there cancellation is worst. */
function sumHolds(form: SpectralForm, pencil: DensePencil): boolean {
  const { poles, kept, residueNorm, outputs, inputs } = form;
  if (kept.length === 0 || outputs === 0 || inputs === 0) return true;
  const slot = residueNorm.indexOf(residueNorm.reduce((high, norm) => Math.max(high, norm), 0));
  const omega = 1.1 * Math.hypot(poles.re[kept[slot]], poles.im[kept[slot]]) + 0.1 * poles.shift;
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

/** C P(s₀)⁻¹ B, where every term of the sum stands at its residue, less the finite poles and their conjugates. */
function constantPart(
  pencil: DensePencil,
  poles: QuadraticPoles,
  kept: Int32Array,
  residueRe: Float64Array,
): Float64Array {
  const { massMatrix, velocityMatrix, displacementMatrix, inputMatrix, outputTransposedMatrix } = pencil;
  const s = poles.shift;
  const values = displacementMatrix.values.map(
    (value, q) => value + s * (velocityMatrix.values[q] + s * massMatrix.values[q]),
  );
  const responses = { ...inputMatrix, values: inputMatrix.values.slice() };
  factorDense({ ...massMatrix, values }).solveInPlace(responses);
  const { values: constant } = multiplyTransposed(outputTransposedMatrix, responses);
  const size = constant.length;
  kept.forEach((j, slot) => {
    const times = poles.im[j] === 0 ? 1 : 2;
    for (let t = 0; t < size; t++) constant[t] -= times * residueRe[slot * size + t];
  });
  return constant;
}

/**
 * Index of a finite pole in the band that lies on the axis and is seen by B and C: there the gain is infinite. One
 * at s = 0 counts when S is singular to rounding, for a creeping mode is no rigid one. −1 when there is none.
 */
export function poleOnAxis(form: SpectralForm, pencil: DensePencil, band: Band): number {
  const { poles, kept, residueNorm } = form;
  const { shift } = poles;
  const slot = kept.findIndex((j, k) => {
    const [re, im] = [poles.re[j], poles.im[j]];
    if (!(residueNorm[k] > 0) || !inBand(band, im)) return false;
    if (Math.hypot(re, im) < 1e-5 * shift)
      return !(factorDense(pencil.displacementMatrix).pivotRatio > 1e-14);
    return Math.abs(re) <= onAxis * im;
  });
  return slot < 0 ? -1 : kept[slot];
}

/**
 * An undamped mode that B and C do not see has a residue of rounding errors over a distance of
 * rounding errors: a gain of pure noise. Its residue is zero by declaration.
 */
function dropUnseenAxisPoles(form: SpectralForm): void {
  const { poles, kept, residueNorm, inertNorm, residueRe, residueIm, outputs, inputs } = form;
  const largest = residueNorm.reduce((high, norm) => Math.max(high, norm), 0);
  kept.forEach((j, slot) => {
    const near = Math.abs(poles.re[j]) <= onAxis * Math.max(poles.shift, poles.im[j]);
    if (!near || residueNorm[slot] > unseen * largest) return;
    residueNorm[slot] = 0;
    inertNorm[slot] = 0;
    residueRe.fill(0, slot * outputs * inputs, (slot + 1) * outputs * inputs);
    residueIm.fill(0, slot * outputs * inputs, (slot + 1) * outputs * inputs);
  });
}

function asComplex(a: DenseMatrix): ComplexMatrix {
  return { rows: a.rows, cols: a.cols, re: a.values, im: new Float64Array(a.values.length) };
}
