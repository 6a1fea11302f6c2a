/**
 * Solves with a factorisation and refines each column until its backward error is negligible
 * or no longer falls.
 *
 * Source: Skeel, Math. Comp. 35(151), 1980 (one correction usually suffices).
 */

import { invariant, NumericalError } from "../../errors.js";
import { type ComplexMatrix, complexZeros } from "../dense/matrix.js";
import {
  BACKWARD_ERROR_GOAL,
  backwardErrorOf,
  MOST_REFINEMENTS,
  type SolveReport,
  STAGNATION,
} from "./backward-error.js";
import {
  SHARED_COLUMNS,
  subtractAdjointProductInto,
  subtractProductInto,
} from "./complex-sparse-products.js";
import type { ComplexValues, SparsePattern } from "./sparse-matrix.js";

/** Infinity norms of A and Aᴴ. */
export interface MatrixNorms {
  readonly plain: number;
  readonly adjoint: number;
}

/** Norms of A and of the equilibrated D A D. */
export interface RefinementNorms {
  readonly given: MatrixNorms;
  readonly scaled: MatrixNorms;
}

export class ComplexRefinement {
  private readonly pattern: SparsePattern;
  private readonly values: ComplexValues;
  private readonly scale: Float64Array;
  private readonly inverseScale: Float64Array;
  private readonly norms: MatrixNorms;
  private readonly scaledNorms: MatrixNorms;

  /** @param scale - The diagonal of D that equilibrates D A D. */
  constructor(pattern: SparsePattern, values: ComplexValues, scale: Float64Array, norms: RefinementNorms) {
    this.pattern = pattern;
    this.values = values;
    this.scale = scale;
    this.inverseScale = scale.map((d) => 1 / d);
    this.norms = norms.given;
    this.scaledNorms = norms.scaled;
  }

  /**
   * B ← A⁻¹ B, or A⁻ᴴ B when `adjoint`.
   *
   * @param apply - Overwrites its argument (n×any) with the unrefined solution.
   * @throws NumericalError `numerics.singular` when a solution is not finite.
   */
  solve(b: ComplexMatrix, adjoint: boolean, apply: (x: ComplexMatrix) => void): SolveReport {
    invariant(b.rows === this.pattern.rows, `solve: ${b.rows} rows for an order of ${this.pattern.rows}`);
    const given = { rows: b.rows, cols: b.cols, re: b.re.slice(), im: b.im.slice() };
    apply(b);
    const residual = complexZeros(b.rows, b.cols);
    const error = new Float64Array(b.cols);
    this.residualInto(residual, b, given, Array.from(error.keys()), adjoint);
    for (let c = 0; c < b.cols; c++) error[c] = this.columnError(residual, b, given, c, adjoint);
    let open = columnsAbove(error);
    let refinements = 0;
    while (open.length > 0 && refinements < MOST_REFINEMENTS) {
      open = this.refineColumns(open, b, given, residual, error, adjoint, apply);
      refinements++;
    }
    return { backwardError: error.reduce((a, e) => Math.max(a, e), 0), refinements };
  }

  /** Corrects these columns where that helps; returns those that deserve another correction. */
  private refineColumns(
    open: number[],
    x: ComplexMatrix,
    b: ComplexMatrix,
    residual: ComplexMatrix,
    error: Float64Array,
    adjoint: boolean,
    apply: (x: ComplexMatrix) => void,
  ): number[] {
    const n = x.rows;
    const correction = complexZeros(n, open.length);
    const before = complexZeros(n, open.length);
    for (let t = 0; t < open.length; t++) {
      copyColumn(correction, t, residual, open[t]);
      copyColumn(before, t, x, open[t]);
    }
    apply(correction);
    for (let t = 0; t < open.length; t++) {
      const shift = open[t] * n;
      for (let i = 0; i < n; i++) {
        x.re[i + shift] += correction.re[i + t * n];
        x.im[i + shift] += correction.im[i + t * n];
      }
    }
    this.residualInto(residual, x, b, open, adjoint);
    return open.filter((c, t) => {
      const old = error[c];
      error[c] = this.columnError(residual, x, b, c, adjoint);
      if (error[c] >= old) {
        copyColumn(x, c, before, t);
        error[c] = old;
        return false;
      }
      return error[c] > BACKWARD_ERROR_GOAL && error[c] <= STAGNATION * old;
    });
  }

  /** Backward error of a column from its residual. */
  private columnError(
    residual: ComplexMatrix,
    x: ComplexMatrix,
    b: ComplexMatrix,
    c: number,
    adjoint: boolean,
  ): number {
    const { scale, inverseScale } = this;
    const side = adjoint ? "adjoint" : "plain";
    const [normX, scaledX] = columnNorms(x, c, inverseScale);
    const [normB, scaledB] = columnNorms(b, c, scale);
    const [normR, scaledR] = columnNorms(residual, c, scale);
    const error = backwardErrorOf(normR, this.norms[side], normX, normB);
    const scaledError = backwardErrorOf(scaledR, this.scaledNorms[side], scaledX, scaledB);
    if (!Number.isFinite(normX) || !Number.isFinite(error) || !Number.isFinite(scaledError)) {
      throw new NumericalError(
        "numerics.singular",
        `column ${c} of the solution is not finite (right-hand side of norm ${normB.toExponential(2)})`,
        "The matrix is singular or its entries span too wide a range; check supports, units and massless dofs.",
      );
    }
    return Math.max(error, scaledError);
  }

  /** R ← B − A X, or B − Aᴴ X, in these columns; several share one pass over the matrix. */
  private residualInto(
    residual: ComplexMatrix,
    x: ComplexMatrix,
    b: ComplexMatrix,
    columns: readonly number[],
    adjoint: boolean,
  ): void {
    const { pattern, values } = this;
    for (const c of columns) copyColumn(residual, c, b, c);
    const subtract = adjoint ? subtractAdjointProductInto : subtractProductInto;
    for (let t = 0; t < columns.length; t += SHARED_COLUMNS) {
      subtract(residual, pattern, values, x, columns.slice(t, t + SHARED_COLUMNS));
    }
  }
}

function columnsAbove(error: Float64Array): number[] {
  return Array.from(error.keys()).filter((c) => error[c] > BACKWARD_ERROR_GOAL);
}

function copyColumn(target: ComplexMatrix, to: number, source: ComplexMatrix, from: number): void {
  const n = source.rows;
  target.re.set(source.re.subarray(from * n, (from + 1) * n), to * n);
  target.im.set(source.im.subarray(from * n, (from + 1) * n), to * n);
}

/** Largest modulus in column c, as it is and weighted; NaN when an entry is. */
function columnNorms(x: ComplexMatrix, c: number, weight: Float64Array): [plain: number, weighted: number] {
  let plain = 0;
  let weighted = 0;
  for (let i = 0, p = c * x.rows; i < x.rows; i++, p++) {
    const re = x.re[p] * weight[i];
    const im = x.im[p] * weight[i];
    const square = x.re[p] * x.re[p] + x.im[p] * x.im[p];
    const scaled = re * re + im * im;
    if (square > plain) plain = square;
    if (scaled > weighted) weighted = scaled;
    if (Number.isNaN(scaled)) return [Number.NaN, Number.NaN];
  }
  return [Math.sqrt(plain), Math.sqrt(weighted)];
}
