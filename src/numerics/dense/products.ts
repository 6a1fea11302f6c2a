/** Products of dense matrices. */

import { invariant } from "../../errors.js";
import { addProductInto, addTransposedProductInto, type Block, type ComplexBlock } from "./block-kernels.js";
import { addAdjointProductInto, addComplexProductInto } from "./complex-block-kernels.js";
import { type ComplexMatrix, complexZeros, type DenseMatrix, zeros } from "./matrix.js";

/** The whole of a matrix as a block. */
export function wholeBlock(a: DenseMatrix): Block {
  return { values: a.values, at: 0, stride: a.rows };
}

/** The whole of a complex matrix as a block. */
export function wholeComplexBlock(a: ComplexMatrix): ComplexBlock {
  return { re: a.re, im: a.im, at: 0, stride: a.rows };
}

/** A B, m×k times k×n. */
export function multiply(a: DenseMatrix, b: DenseMatrix): DenseMatrix {
  invariant(a.cols === b.rows, `product of ${a.rows}×${a.cols} and ${b.rows}×${b.cols}`);
  const c = zeros(a.rows, b.cols);
  addProductInto(wholeBlock(c), 1, wholeBlock(a), wholeBlock(b), a.rows, b.cols, a.cols);
  return c;
}

/** Aᵀ B, both tall with the same number of rows; for `a === b` only half is computed and the result is exactly symmetric. */
export function multiplyTransposed(a: DenseMatrix, b: DenseMatrix): DenseMatrix {
  invariant(a.rows === b.rows, `transposed product of ${a.rows}×${a.cols} and ${b.rows}×${b.cols}`);
  const c = zeros(a.cols, b.cols);
  const symmetric = a === b;
  addTransposedProductInto(wholeBlock(c), 1, wholeBlock(a), wholeBlock(b), a.cols, b.cols, a.rows, symmetric);
  if (symmetric) {
    for (let j = 0; j < c.cols; j++) {
      for (let i = 0; i < j; i++) c.values[j + i * c.rows] = c.values[i + j * c.rows];
    }
  }
  return c;
}

/** A B, complex. */
export function complexMultiply(a: ComplexMatrix, b: ComplexMatrix): ComplexMatrix {
  invariant(a.cols === b.rows, `product of ${a.rows}×${a.cols} and ${b.rows}×${b.cols}`);
  const c = complexZeros(a.rows, b.cols);
  const [cb, ab, bb] = [wholeComplexBlock(c), wholeComplexBlock(a), wholeComplexBlock(b)];
  addComplexProductInto(cb, 1, ab, bb, a.rows, b.cols, a.cols);
  return c;
}

/** Aᴴ B, complex. */
export function complexMultiplyAdjoint(a: ComplexMatrix, b: ComplexMatrix): ComplexMatrix {
  invariant(a.rows === b.rows, `adjoint product of ${a.rows}×${a.cols} and ${b.rows}×${b.cols}`);
  const c = complexZeros(a.cols, b.cols);
  const [cb, ab, bb] = [wholeComplexBlock(c), wholeComplexBlock(a), wholeComplexBlock(b)];
  addAdjointProductInto(cb, 1, ab, bb, a.cols, b.cols, a.rows);
  return c;
}
