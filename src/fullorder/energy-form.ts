import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { SymmetricFactorisation } from "../numerics/sparse/symmetric-ldl.js";
import type { FullPencil } from "./full-model.js";

/**
 * E = K + σM, positive definite by the inertia of its factorisation: the inner product in which
 * bases are orthonormal, and the operator that answers a static load even on a free-floating model.
 * Where no σ makes K + σM definite (indefinite K on massless dofs) E is the diagonal |K| + σ|M| and
 * the factorisation is still that of K + σM.
 */
export interface EnergyForm {
  readonly sigma: number;
  readonly matrix: SparseMatrix;
  readonly factorisation: SymmetricFactorisation;
  readonly definite: boolean;
}

/** @param omega - frequency [rad/s] whose square is the first σ tried; it grows tenfold at most six times. */
export function energyForm(pencil: FullPencil, omega: number): EnergyForm {
  let sigma = omega * omega;
  let factorisation = pencil.factorUndamped(-sigma);
  for (let attempt = 0; attempt < 6 && !isDefinite(factorisation); attempt++) {
    sigma *= 10;
    factorisation = pencil.factorUndamped(-sigma);
  }
  const definite = isDefinite(factorisation);
  const matrix = definite ? shifted(pencil, sigma) : absoluteDiagonal(pencil, sigma);
  return { sigma, matrix, factorisation, definite };
}

function isDefinite({ inertia, inertiaReliable }: SymmetricFactorisation): boolean {
  return inertiaReliable && inertia.negative === 0 && inertia.zero === 0;
}

function shifted(pencil: FullPencil, sigma: number): SparseMatrix {
  const { massMatrix, stiffnessMatrix } = pencil;
  const values = stiffnessMatrix.values.map((k, p) => k + sigma * massMatrix.values[p]);
  return { ...stiffnessMatrix, values };
}

function absoluteDiagonal(pencil: FullPencil, sigma: number): SparseMatrix {
  const { massMatrix, stiffnessMatrix, order } = pencil;
  const { colStart, rowIndex } = stiffnessMatrix;
  const diagonal = new Float64Array(order);
  for (let j = 0; j < order; j++) {
    for (let p = colStart[j]; p < colStart[j + 1]; p++) {
      const size = Math.abs(stiffnessMatrix.values[p]) + sigma * Math.abs(massMatrix.values[p]);
      diagonal[j] = Math.max(diagonal[j], rowIndex[p] === j ? size : 1e-12 * size);
    }
  }
  // A model without mass and stiffness (first order) is measured with the plain Euclidean norm.
  const largest = diagonal.reduce((high, d) => Math.max(high, d), 0);
  const floor = largest === 0 ? 1 : largest * 1e-15;
  const identity = Int32Array.from({ length: order }, (_, i) => i);
  return {
    rows: order,
    cols: order,
    colStart: Int32Array.from({ length: order + 1 }, (_, i) => i),
    rowIndex: identity,
    values: diagonal.map((d) => Math.max(d, floor)),
  };
}
