import type { DenseMatrix } from "../numerics/dense/matrix.js";
import { zeros } from "../numerics/dense/matrix.js";
import { createRandom } from "../numerics/random.js";
import { shiftInvertLanczos } from "../numerics/sparse/lanczos.js";
import { multiplyAddInto } from "../numerics/sparse/sparse-matrix.js";
import type { EnergyForm } from "./energy-form.js";
import type { FullPencil } from "./full-model.js";

/** Real undamped modes K x = λ M x up to an upper frequency, with the proof that none is missing. */
export interface NaturalModes {
  /** λ = ω², ascending; negative where K is indefinite. */
  readonly lambda: Float64Array;
  /** M-orthonormal columns. */
  readonly vectors: DenseMatrix;
  /** Number of modes below the upper frequency by the inertia of K − ω²M. */
  readonly count: number;
  /** Every counted mode was found, and the count is reliable. */
  readonly complete: boolean;
}

/** Number of λ below ω² by Sylvester's law of inertia, and whether the count is a proof. */
export function countModesBelow(pencil: FullPencil, omega: number): { count: number; reliable: boolean } {
  const factorisation = pencil.factorUndamped(omega * omega);
  const { inertia, inertiaReliable } = factorisation;
  factorisation.release();
  return { count: inertia.negative, reliable: inertiaReliable && inertia.zero === 0 };
}

/** All modes with λ < ω²; two real factorisations counting the one inside `energy`. */
export function naturalModes(
  pencil: FullPencil,
  omega: number,
  energy: EnergyForm,
  count: number,
): NaturalModes {
  const { order, massMatrix } = pencil;
  if (count === 0) return { lambda: new Float64Array(0), vectors: zeros(order, 0), count, complete: true };
  const upper = omega * omega;
  const result = shiftInvertLanczos(
    {
      order,
      shift: -energy.sigma,
      applyMassInto: (y, x) => {
        y.fill(0);
        multiplyAddInto(y, 1, massMatrix, x);
      },
      solveInPlace: (b) => void energy.factorisation.solveInPlace(b),
    },
    {
      lower: energy.definite ? -energy.sigma : -1e3 * upper,
      upper,
      expected: count,
      blockSize: 4,
      tolerance: 1e-9,
      maximumSolves: 60 * count + 2000,
      random: createRandom(20),
    },
  );
  return { lambda: result.values, vectors: result.vectors, count, complete: result.status === "complete" };
}
