/** What the kernels offer, compiled for vectors where the build has them. */

import { eliminateComplex as complexFront } from "./complex-front";
import * as complex from "./complex-triangles";
import { FREE } from "./layout";
import * as real from "./real-triangles";
import { eliminateSymmetric as symmetricFront } from "./symmetric-front";

export {
  addLowerUpdate,
  addSquareUpdate,
  gatherRows,
  packLower,
  packRows,
  packSquare,
  scatterRows,
} from "./assembling";
export { setOutsideFrom } from "./host";
export { perturbedSymmetricPivots, symmetricScratch } from "./symmetric-front";

/** First byte that the caller may use. */
export function firstFree(): usize {
  return FREE;
}

export function eliminateComplex(
  frontRe: usize,
  frontIm: usize,
  frontOrder: i32,
  frontSummed: i32,
  frontRowIds: usize,
  frontColIds: usize,
  tinyPivot: f64,
  isRoot: bool,
): i32 {
  if (ASC_FEATURE_SIMD)
    return complexFront<v128>(
      frontRe,
      frontIm,
      frontOrder,
      frontSummed,
      frontRowIds,
      frontColIds,
      tinyPivot,
      isRoot,
    );
  else
    return complexFront<f64>(
      frontRe,
      frontIm,
      frontOrder,
      frontSummed,
      frontRowIds,
      frontColIds,
      tinyPivot,
      isRoot,
    );
}

export function subtractComplex(
  yRe: usize,
  yIm: usize,
  yStride: i32,
  aRe: usize,
  aIm: usize,
  aStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  m: i32,
  n: i32,
  k: i32,
  adjoint: bool,
): void {
  if (ASC_FEATURE_SIMD)
    complex.subtractComplex<v128>(yRe, yIm, yStride, aRe, aIm, aStride, xRe, xIm, xStride, m, n, k, adjoint);
  else
    complex.subtractComplex<f64>(yRe, yIm, yStride, aRe, aIm, aStride, xRe, xIm, xStride, m, n, k, adjoint);
}

export function solveComplexUnitLower(
  lRe: usize,
  lIm: usize,
  lStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  if (ASC_FEATURE_SIMD) complex.solveComplexUnitLower<v128>(lRe, lIm, lStride, xRe, xIm, xStride, n, k);
  else complex.solveComplexUnitLower<f64>(lRe, lIm, lStride, xRe, xIm, xStride, n, k);
}

export function solveComplexUnitLowerAdjoint(
  lRe: usize,
  lIm: usize,
  lStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  if (ASC_FEATURE_SIMD)
    complex.solveComplexUnitLowerAdjoint<v128>(lRe, lIm, lStride, xRe, xIm, xStride, n, k);
  else complex.solveComplexUnitLowerAdjoint<f64>(lRe, lIm, lStride, xRe, xIm, xStride, n, k);
}

export function solveComplexUpper(
  uRe: usize,
  uIm: usize,
  uStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  if (ASC_FEATURE_SIMD) complex.solveComplexUpper<v128>(uRe, uIm, uStride, xRe, xIm, xStride, n, k);
  else complex.solveComplexUpper<f64>(uRe, uIm, uStride, xRe, xIm, xStride, n, k);
}

export function solveComplexUpperAdjoint(
  uRe: usize,
  uIm: usize,
  uStride: i32,
  xRe: usize,
  xIm: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  if (ASC_FEATURE_SIMD) complex.solveComplexUpperAdjoint<v128>(uRe, uIm, uStride, xRe, xIm, xStride, n, k);
  else complex.solveComplexUpperAdjoint<f64>(uRe, uIm, uStride, xRe, xIm, xStride, n, k);
}

export function eliminateSymmetric(
  front: usize,
  frontOrder: i32,
  frontSummed: i32,
  frontIds: usize,
  frontDiagonal: usize,
  scratch: usize,
  tinyPivot: f64,
  isRoot: bool,
): i32 {
  if (ASC_FEATURE_SIMD)
    return symmetricFront<v128>(
      front,
      frontOrder,
      frontSummed,
      frontIds,
      frontDiagonal,
      scratch,
      tinyPivot,
      isRoot,
    );
  else
    return symmetricFront<f64>(
      front,
      frontOrder,
      frontSummed,
      frontIds,
      frontDiagonal,
      scratch,
      tinyPivot,
      isRoot,
    );
}

export function subtractReal(
  y: usize,
  yStride: i32,
  a: usize,
  aStride: i32,
  x: usize,
  xStride: i32,
  m: i32,
  n: i32,
  k: i32,
  transposed: bool,
): void {
  if (ASC_FEATURE_SIMD) real.subtractReal<v128>(y, yStride, a, aStride, x, xStride, m, n, k, transposed);
  else real.subtractReal<f64>(y, yStride, a, aStride, x, xStride, m, n, k, transposed);
}

export function solveRealUnitLower(l: usize, lStride: i32, x: usize, xStride: i32, n: i32, k: i32): void {
  if (ASC_FEATURE_SIMD) real.solveRealUnitLower<v128>(l, lStride, x, xStride, n, k);
  else real.solveRealUnitLower<f64>(l, lStride, x, xStride, n, k);
}

export function solveRealUnitLowerTransposed(
  l: usize,
  lStride: i32,
  x: usize,
  xStride: i32,
  n: i32,
  k: i32,
): void {
  if (ASC_FEATURE_SIMD) real.solveRealUnitLowerTransposed<v128>(l, lStride, x, xStride, n, k);
  else real.solveRealUnitLowerTransposed<f64>(l, lStride, x, xStride, n, k);
}
