import type { Pencil } from "../model/pencil.js";
import { applyPencil, pencilNorm } from "../model/pencil.js";
import { addScaledInto, norm2 } from "../numerics/dense/complex-vectors.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import { applyComplexTransposed } from "../numerics/real-operator.js";
import { applyInput, type ChannelGain } from "./channel-gain.js";
import type { Checked } from "./measure.js";

/** The proof of a margin's upper end: a vector that the full model, with the model error or multiplier in, sends to zero. */
export interface Witness {
  /** ‖(P + s^k B Δ C) x‖ / ((‖P‖ + ‖s^k B Δ C‖) ‖x‖); for eigenvalues and crossings Δ is absent. */
  readonly residual: number;
  /** Size ‖Δ‖ of the model error that reaches the axis; null where there is none. */
  readonly size: number | null;
  /** x by free dof. */
  readonly vector: ComplexVector;
}

export function witnessOf(pencil: Pencil, checked: Checked): Witness {
  const { found } = checked;
  if (found.kind === "peak") return perturbationWitness(pencil, found.gain);
  const right = found.kind === "eigenvalue" ? found.pair.right : found.crossing.right;
  return { residual: checked.error, size: null, vector: right };
}

/** Δ = −(1/σ) v uᴴ with H v = σ u, x = P⁻¹ B diag(s^k) v: then (P + B diag(s^k) Δ C) x = 0. */
function perturbationWitness(pencil: Pencil, gain: ChannelGain): Witness {
  const { sRe, sIm, sigma, u, v, x } = gain;
  const outputs = applyComplexTransposed(pencil.outputTransposed, x);
  let cRe = 0;
  let cIm = 0;
  for (let k = 0; k < u.re.length; k++) {
    cRe += u.re[k] * outputs.re[k] + u.im[k] * outputs.im[k];
    cIm += u.re[k] * outputs.im[k] - u.im[k] * outputs.re[k];
  }
  const load = applyInput(pencil, sRe, sIm, v);
  const residual = applyPencil(pencil, sRe, sIm, x);
  addScaledInto(residual, -cRe / sigma, -cIm / sigma, load);
  // The error is rank one: ‖B diag(s^k) Δ C‖ = ‖B diag(s^k) v‖ ‖Cᵀu‖ / σ.
  const errorNorm = (norm2(load) * pencil.outputTransposed.normBound) / sigma;
  const scale = (pencilNorm(pencil, sRe, sIm) + errorNorm) * norm2(x);
  return { residual: norm2(residual) / scale, size: 1 / sigma, vector: x };
}
