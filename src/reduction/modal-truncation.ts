import { cholesky, solveLowerInPlace, solveLowerTransposedInPlace } from "../numerics/dense/cholesky.js";
import { type DenseMatrix, zeros } from "../numerics/dense/matrix.js";
import { multiply, multiplyTransposed } from "../numerics/dense/products.js";
import { symmetricEigen } from "../numerics/dense/symmetric-eigen.js";
import { type DensePencil, densePencil } from "./reduced-model.js";

/**
 * A reduced pencil cut down to its own real modes below `omega` [rad/s]: the second level of a two-level
 * model, for searching only. With E = K + σM = LLᵀ, the modes are eigenvectors of L⁻¹ M L⁻ᵀ, whose
 * eigenvalues 1/(λ + σ) stay bounded however singular M is. Returns the pencil unchanged when K + σM is not
 * positive definite.
 */
export function truncateModes(pencil: DensePencil, omega: number): DensePencil {
  const sigma = omega * omega;
  const energy = zeros(pencil.order, pencil.order);
  const { massMatrix, stiffnessMatrix } = pencil;
  for (let q = 0; q < energy.values.length; q++) {
    energy.values[q] = stiffnessMatrix.values[q] + sigma * massMatrix.values[q];
  }
  const lower = cholesky(energy);
  if (lower === null) return pencil;
  const scaled = { ...massMatrix, values: massMatrix.values.slice() };
  solveLowerInPlace(lower, scaled);
  const turned = transposed(scaled);
  solveLowerInPlace(lower, turned);
  const { values, vectors } = symmetricEigen(turned);
  // λ ≤ ω² means 1/(λ + σ) ≥ 1/(2σ).
  const first = values.findIndex((value) => value >= 0.5 / sigma);
  if (first < 0) return pencil;
  const modes = {
    rows: vectors.rows,
    cols: vectors.cols - first,
    values: vectors.values.slice(first * vectors.rows),
  };
  solveLowerTransposedInPlace(lower, modes);
  // The modes make E the identity, so mass and stiffness are known: diagonal.
  const order = modes.cols;
  const mass = zeros(order, order);
  const stiffness = zeros(order, order);
  for (let i = 0; i < order; i++) {
    mass.values[i * (order + 1)] = values[first + i];
    stiffness.values[i * (order + 1)] = 1 - sigma * values[first + i];
  }
  const { displacementMatrix } = pencil;
  const circulatory = zeros(pencil.order, pencil.order);
  for (let q = 0; q < circulatory.values.length; q++)
    circulatory.values[q] = displacementMatrix.values[q] - stiffnessMatrix.values[q];
  const project = (a: DenseMatrix) => multiplyTransposed(modes, multiply(a, modes));
  const displacement = project(circulatory);
  for (let i = 0; i < order; i++) displacement.values[i * (order + 1)] += stiffness.values[i * (order + 1)];
  return densePencil(
    mass,
    project(pencil.velocityMatrix),
    displacement,
    stiffness,
    multiplyTransposed(modes, pencil.inputMatrix),
    pencil.powers,
    multiplyTransposed(modes, pencil.outputTransposedMatrix),
  );
}

function transposed(a: DenseMatrix): DenseMatrix {
  const out = zeros(a.cols, a.rows);
  for (let j = 0; j < a.cols; j++)
    for (let i = 0; i < a.rows; i++) out.values[j + i * a.cols] = a.values[i + j * a.rows];
  return out;
}
