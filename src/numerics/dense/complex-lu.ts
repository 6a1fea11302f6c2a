import { invariant } from "../../errors.js";
import type { ComplexBlock } from "./block-kernels.js";
import { addAdjointProductInto, addComplexProductInto } from "./complex-block-kernels.js";
import { requireFiniteMaximum } from "./finite.js";
import type { ComplexMatrix } from "./matrix.js";

/** P A = L U of a square complex matrix, ready to solve. */
export interface ComplexDenseLu {
  readonly order: number;
  /** As in `DenseLu`. */
  readonly pivotRatio: number;
  /** log|det A|, of the factors as used: finite even where pivots were replaced; 0 for order 0. */
  readonly logAbsDet: number;
  /** arg det A [rad], in (−π, π]. */
  readonly phaseDet: number;
  /** b ← A⁻¹ b for every column of b. */
  solveInPlace(b: ComplexMatrix): void;
  /** b ← A⁻ᴴ b for every column of b. */
  solveAdjointInPlace(b: ComplexMatrix): void;
}

const panelWidth = 24;

/**
 * Factors A by Gaussian elimination with partial pivoting (by modulus), blocked
 * by columns. Pivots below eps·max|a| are replaced by that value (by eps for A = 0).
 *
 * @param a - A, n×n, unchanged.
 * @throws NumericalError `numerics.not-finite`.
 */
export function factorDenseComplex(a: ComplexMatrix): ComplexDenseLu {
  invariant(a.rows === a.cols, `LU of a ${a.rows}×${a.cols} matrix`);
  const n = a.rows;
  const what = "A complex matrix to be factored";
  const floor =
    Number.EPSILON * (Math.max(requireFiniteMaximum(a.re, what), requireFiniteMaximum(a.im, what)) || 1);
  const lu: ComplexMatrix = { rows: n, cols: n, re: Float64Array.from(a.re), im: Float64Array.from(a.im) };
  const pivotRow = new Int32Array(n);
  let smallest = Number.POSITIVE_INFINITY;
  let largest = 0;
  for (let begin = 0; begin < n; begin += panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    for (let j = begin; j < end; j++) {
      const pivot = eliminateColumn(lu, j, end, floor, pivotRow);
      smallest = Math.min(smallest, pivot);
      largest = Math.max(largest, pivot);
    }
    updateRight(lu, begin, end);
  }
  return {
    order: n,
    pivotRatio: largest === 0 ? (n === 0 ? 1 : 0) : smallest / largest,
    ...determinant(lu, pivotRow),
    solveInPlace: (b) => solve(lu, pivotRow, b),
    solveAdjointInPlace: (b) => solveAdjoint(lu, pivotRow, b),
  };
}

function determinant(lu: ComplexMatrix, pivotRow: Int32Array): { logAbsDet: number; phaseDet: number } {
  let log = 0;
  let phase = 0;
  for (let j = 0; j < lu.rows; j++) {
    const at = j + j * lu.rows;
    log += Math.log(Math.hypot(lu.re[at], lu.im[at]));
    phase += Math.atan2(lu.im[at], lu.re[at]) + (pivotRow[j] === j ? 0 : Math.PI);
  }
  return { logAbsDet: log, phaseDet: phase - 2 * Math.PI * Math.ceil(phase / (2 * Math.PI) - 0.5) };
}

function eliminateColumn(
  lu: ComplexMatrix,
  j: number,
  end: number,
  floor: number,
  pivotRow: Int32Array,
): number {
  const { rows: n, re, im } = lu;
  const at = j * n;
  let row = j;
  let most = Math.abs(re[at + j]) + Math.abs(im[at + j]);
  for (let i = j + 1; i < n; i++) {
    const size = Math.abs(re[at + i]) + Math.abs(im[at + i]);
    if (size > most) {
      most = size;
      row = i;
    }
  }
  pivotRow[j] = row;
  if (row !== j) swapRows(lu, j, row);
  const met = Math.hypot(re[at + j], im[at + j]);
  if (met < floor) {
    re[at + j] = floor;
    im[at + j] = 0;
  }
  divideByPivot(lu, j);
  for (let c = j + 1; c < end; c++) {
    const fRe = re[c * n + j];
    const fIm = im[c * n + j];
    for (let i = j + 1; i < n; i++) {
      const lRe = re[at + i];
      const lIm = im[at + i];
      re[c * n + i] -= fRe * lRe - fIm * lIm;
      im[c * n + i] -= fRe * lIm + fIm * lRe;
    }
  }
  return met;
}

function swapRows(a: ComplexMatrix, i: number, k: number): void {
  const { rows, cols, re, im } = a;
  for (let p = 0; p < rows * cols; p += rows) {
    const keptRe = re[p + i];
    const keptIm = im[p + i];
    re[p + i] = re[p + k];
    im[p + i] = im[p + k];
    re[p + k] = keptRe;
    im[p + k] = keptIm;
  }
}

function divideByPivot(lu: ComplexMatrix, j: number): void {
  const { rows: n, re, im } = lu;
  const at = j * n;
  // Scaled by its own modulus first, so that neither square overflows nor underflows.
  const modulus = Math.hypot(re[at + j], im[at + j]);
  const cosine = re[at + j] / modulus;
  const sine = im[at + j] / modulus;
  for (let i = j + 1; i < n; i++) {
    const xRe = re[at + i] / modulus;
    const xIm = im[at + i] / modulus;
    re[at + i] = xRe * cosine + xIm * sine;
    im[at + i] = xIm * cosine - xRe * sine;
  }
}

function part(a: ComplexMatrix, i: number, j: number): ComplexBlock {
  return { re: a.re, im: a.im, at: i + j * a.rows, stride: a.rows };
}

function updateRight(lu: ComplexMatrix, begin: number, end: number): void {
  const n = lu.rows;
  for (let c = end; c < n; c++) solveUnitLowerBlock(lu, begin, end, lu, c);
  addComplexProductInto(
    part(lu, end, end),
    -1,
    part(lu, end, begin),
    part(lu, begin, end),
    n - end,
    n - end,
    end - begin,
  );
}

// Forward substitution in column c of b with the unit lower triangle in rows begin … end − 1.
function solveUnitLowerBlock(
  lu: ComplexMatrix,
  begin: number,
  end: number,
  b: ComplexMatrix,
  c: number,
): void {
  const { rows: n, re, im } = lu;
  const at = c * n;
  for (let k = begin; k < end; k++) {
    const xRe = b.re[at + k];
    const xIm = b.im[at + k];
    for (let i = k + 1; i < end; i++) {
      const lRe = re[k * n + i];
      const lIm = im[k * n + i];
      b.re[at + i] -= xRe * lRe - xIm * lIm;
      b.im[at + i] -= xRe * lIm + xIm * lRe;
    }
  }
}

function solveUpperBlock(lu: ComplexMatrix, begin: number, end: number, b: ComplexMatrix, c: number): void {
  const { rows: n, re, im } = lu;
  const at = c * n;
  for (let k = end - 1; k >= begin; k--) {
    divideEntry(b, at + k, re[k * n + k], im[k * n + k]);
    const xRe = b.re[at + k];
    const xIm = b.im[at + k];
    for (let i = begin; i < k; i++) {
      const uRe = re[k * n + i];
      const uIm = im[k * n + i];
      b.re[at + i] -= xRe * uRe - xIm * uIm;
      b.im[at + i] -= xRe * uIm + xIm * uRe;
    }
  }
}

function divideEntry(b: ComplexMatrix, at: number, dRe: number, dIm: number): void {
  const modulus = Math.hypot(dRe, dIm);
  const cosine = dRe / modulus;
  const sine = dIm / modulus;
  const xRe = b.re[at] / modulus;
  const xIm = b.im[at] / modulus;
  b.re[at] = xRe * cosine + xIm * sine;
  b.im[at] = xIm * cosine - xRe * sine;
}

function solve(lu: ComplexMatrix, pivotRow: Int32Array, b: ComplexMatrix): void {
  const n = lu.rows;
  invariant(b.rows === n, `solve of order ${n} with ${b.rows} rows`);
  for (let j = 0; j < n; j++) if (pivotRow[j] !== j) swapRows(b, j, pivotRow[j]);
  for (let begin = 0; begin < n; begin += panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    for (let c = 0; c < b.cols; c++) solveUnitLowerBlock(lu, begin, end, b, c);
    addComplexProductInto(
      part(b, end, 0),
      -1,
      part(lu, end, begin),
      part(b, begin, 0),
      n - end,
      b.cols,
      end - begin,
    );
  }
  for (let begin = Math.floor((n - 1) / panelWidth) * panelWidth; begin >= 0; begin -= panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    for (let c = 0; c < b.cols; c++) solveUpperBlock(lu, begin, end, b, c);
    addComplexProductInto(
      part(b, 0, 0),
      -1,
      part(lu, 0, begin),
      part(b, begin, 0),
      begin,
      b.cols,
      end - begin,
    );
  }
}

// Aᴴ = Uᴴ Lᴴ P: forward with Uᴴ, backward with Lᴴ, then the exchanges undone in reverse.
function solveAdjoint(lu: ComplexMatrix, pivotRow: Int32Array, b: ComplexMatrix): void {
  const n = lu.rows;
  invariant(b.rows === n, `solve of order ${n} with ${b.rows} rows`);
  for (let begin = 0; begin < n; begin += panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    addAdjointProductInto(
      part(b, begin, 0),
      -1,
      part(lu, 0, begin),
      part(b, 0, 0),
      end - begin,
      b.cols,
      begin,
    );
    for (let c = 0; c < b.cols; c++) {
      for (let k = begin; k < end; k++) {
        subtractDot(lu, k, b, c, begin, k);
        divideEntry(b, c * n + k, lu.re[k * n + k], -lu.im[k * n + k]);
      }
    }
  }
  for (let begin = Math.floor((n - 1) / panelWidth) * panelWidth; begin >= 0; begin -= panelWidth) {
    const end = Math.min(begin + panelWidth, n);
    addAdjointProductInto(
      part(b, begin, 0),
      -1,
      part(lu, end, begin),
      part(b, end, 0),
      end - begin,
      b.cols,
      n - end,
    );
    for (let c = 0; c < b.cols; c++) {
      for (let k = end - 2; k >= begin; k--) subtractDot(lu, k, b, c, k + 1, end);
    }
  }
  for (let j = n - 1; j >= 0; j--) if (pivotRow[j] !== j) swapRows(b, j, pivotRow[j]);
}

// b(k, c) −= Σ conj(lu(i, k)) b(i, c) over rows first … end − 1.
function subtractDot(
  lu: ComplexMatrix,
  k: number,
  b: ComplexMatrix,
  c: number,
  first: number,
  end: number,
): void {
  const n = lu.rows;
  let sRe = 0;
  let sIm = 0;
  for (let i = first; i < end; i++) {
    const lRe = lu.re[k * n + i];
    const lIm = lu.im[k * n + i];
    sRe += lRe * b.re[c * n + i] + lIm * b.im[c * n + i];
    sIm += lRe * b.im[c * n + i] - lIm * b.re[c * n + i];
  }
  b.re[c * n + k] -= sRe;
  b.im[c * n + k] -= sIm;
}
