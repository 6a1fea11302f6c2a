/** What the kernels offer. */

import { FREE } from "./layout";

export {
  addLowerUpdate,
  addSquareUpdate,
  clear,
  gatherRows,
  packLower,
  packRows,
  packSquare,
  scatterRows,
} from "./assembling";
export { eliminateComplex } from "./complex-front";
export {
  solveComplexUnitLower,
  solveComplexUnitLowerAdjoint,
  solveComplexUpper,
  solveComplexUpperAdjoint,
  subtractComplex,
} from "./complex-triangles";
export { setOutsideFrom } from "./host";
export { solveRealUnitLower, solveRealUnitLowerTransposed, subtractReal } from "./real-triangles";
export { eliminateSymmetric, perturbedSymmetricPivots, symmetricScratch } from "./symmetric-front";

/** First byte that the caller may use. */
export function firstFree(): usize {
  return FREE;
}
