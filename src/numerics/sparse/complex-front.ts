/**
 * Partial LU of one dense front with threshold pivoting. Pivots come from the fully summed
 * rows and columns; columns without an acceptable pivot are left over for the parent front.
 *
 * Source: Duff & Reid, ACM TOMS 9(3), 1983 (delayed pivots); Li & Demmel, ACM TOMS 29(2),
 * 2003 (replacing tiny pivots).
 */

import { type ComplexBlock, solveUnitLowerInPlace, subtractProductInto } from "./complex-kernels.js";

/** A square front; column j starts at `j * order` of `re` and `im`. */
export interface ComplexFront {
  readonly re: Float64Array;
  readonly im: Float64Array;
  readonly order: number;
  /** The first rows and columns, whose entries are complete. */
  readonly summed: number;
  /** Dofs of the rows and columns, permuted along with them. */
  readonly rowIds: Int32Array;
  readonly colIds: Int32Array;
}

export interface PivotRule {
  /** A pivot of at most this modulus is replaced by this value, when nothing better can come. */
  readonly tiny: number;
  /** No parent can take delayed columns. */
  readonly isRoot: boolean;
}

export interface Elimination {
  readonly pivots: number;
  readonly perturbed: number;
}

/** Columns eliminated between two updates of the rest of the front. */
const PANEL = 24;
/** A pivot must reach this share of its column. */
const THRESHOLD = 0.01;
/** The diagonal is taken, without looking further, from this share on. */
const DIAGONAL_PREFERENCE = 0.1;

const REJECT = -1;
const CLOSE_PANEL = -2;

/** Leaves L (unit diagonal implied) and U in the first `pivots` columns and rows, the update in the rest. */
export function eliminateComplexFront(front: ComplexFront, rule: PivotRule): Elimination {
  return new FrontElimination(front, rule).run();
}

class FrontElimination {
  private readonly front: ComplexFront;
  private readonly rule: PivotRule;
  /** Only negligible columns are left in a root. */
  private forced = false;
  private perturbed = 0;
  /** The columns from here to the end of the current panel have no acceptable pivot. */
  private rejectedFrom = 0;

  constructor(front: ComplexFront, rule: PivotRule) {
    this.front = front;
    this.rule = rule;
  }

  run(): Elimination {
    const { summed } = this.front;
    let done = 0;
    // Columns from here on were refused since the candidates were last gathered.
    let candidatesEnd = summed;
    let advanced = false;
    while (done < summed) {
      if (done === candidatesEnd) {
        if (!advanced && !this.rule.isRoot) break;
        this.forced = !advanced;
        candidatesEnd = summed;
        advanced = false;
      }
      const end = Math.min(done + PANEL, candidatesEnd);
      const pivoted = this.eliminatePanel(done, end);
      this.updateBeyond(done, pivoted, end);
      this.moveRejected(end, candidatesEnd);
      candidatesEnd -= end - this.rejectedFrom;
      advanced = advanced || pivoted > done;
      done = pivoted;
    }
    return { pivots: done, perturbed: this.perturbed };
  }

  /** Eliminates what it can of the columns [begin, end); rejected ones end up last. Returns the end of the pivots. */
  private eliminatePanel(begin: number, end: number): number {
    let k = begin;
    this.rejectedFrom = end;
    while (k < this.rejectedFrom) {
      const row = this.choosePivotRow(k, k === begin);
      if (row === CLOSE_PANEL) break;
      if (row === REJECT) {
        this.rejectedFrom--;
        this.swapColumns(k, this.rejectedFrom);
        continue;
      }
      this.swapRows(k, row);
      this.eliminateColumn(k, end);
      k++;
    }
    return k;
  }

  /** Row of the pivot for column k, or a refusal. `current` tells that the whole row k is up to date. */
  private choosePivotRow(k: number, current: boolean): number {
    const { re, im, order, summed } = this.front;
    const { tiny } = this.rule;
    const column = k * order;
    let best = -1;
    let bestRow = k;
    for (let i = k; i < summed; i++) {
      const m = re[column + i] * re[column + i] + im[column + i] * im[column + i];
      if (m > best) {
        best = m;
        bestRow = i;
      }
    }
    let largest = best;
    for (let i = summed; i < order; i++) {
      const m = re[column + i] * re[column + i] + im[column + i] * im[column + i];
      if (m > largest) largest = m;
    }
    if (largest <= tiny * tiny) {
      if (this.forced) return this.perturb(k, bestRow);
      if (!current) return CLOSE_PANEL;
      return this.rowIsNegligible(k) ? this.perturb(k, k) : REJECT;
    }
    const diagonal = re[column + k] * re[column + k] + im[column + k] * im[column + k];
    if (diagonal >= DIAGONAL_PREFERENCE * DIAGONAL_PREFERENCE * largest) return k;
    return best >= THRESHOLD * THRESHOLD * largest ? bestRow : REJECT;
  }

  private rowIsNegligible(k: number): boolean {
    const { re, im, order } = this.front;
    for (let p = k + k * order; p < order * order; p += order) {
      if (Math.abs(re[p]) + Math.abs(im[p]) > this.rule.tiny) return false;
    }
    return true;
  }

  private perturb(k: number, row: number): number {
    const { re, im, order } = this.front;
    re[row + k * order] = this.rule.tiny;
    im[row + k * order] = 0;
    this.perturbed++;
    return row;
  }

  private swapColumns(a: number, b: number): void {
    if (a === b) return;
    const { re, im, order, colIds } = this.front;
    const aAt = a * order;
    const bAt = b * order;
    for (let i = 0; i < order; i++) {
      const xr = re[aAt + i];
      const xi = im[aAt + i];
      re[aAt + i] = re[bAt + i];
      im[aAt + i] = im[bAt + i];
      re[bAt + i] = xr;
      im[bAt + i] = xi;
    }
    const id = colIds[a];
    colIds[a] = colIds[b];
    colIds[b] = id;
  }

  private swapRows(a: number, b: number): void {
    if (a === b) return;
    const { re, im, order, rowIds } = this.front;
    for (let p = 0; p < order * order; p += order) {
      const xr = re[p + a];
      const xi = im[p + a];
      re[p + a] = re[p + b];
      im[p + a] = im[p + b];
      re[p + b] = xr;
      im[p + b] = xi;
    }
    const id = rowIds[a];
    rowIds[a] = rowIds[b];
    rowIds[b] = id;
  }

  /** Divides column k by its pivot and subtracts it from the columns up to `end`. */
  private eliminateColumn(k: number, end: number): void {
    const { re, im, order } = this.front;
    const column = k * order;
    const pr = re[column + k];
    const pi = im[column + k];
    const d = 1 / (pr * pr + pi * pi);
    const qr = pr * d;
    const qi = -pi * d;
    for (let i = column + k + 1; i < column + order; i++) {
      const xr = re[i];
      const xi = im[i];
      re[i] = xr * qr - xi * qi;
      im[i] = xr * qi + xi * qr;
    }
    let j = k + 1;
    for (; j + 1 < end; j += 2) this.subtractFromPair(k, j);
    if (j < end) this.subtractFromOne(k, j);
  }

  private subtractFromPair(k: number, j: number): void {
    const { re, im, order } = this.front;
    const first = j * order;
    const second = first + order;
    const b0r = re[first + k];
    const b0i = im[first + k];
    const b1r = re[second + k];
    const b1i = im[second + k];
    const column = k * order;
    for (let i = k + 1; i < order; i++) {
      const xr = re[column + i];
      const xi = im[column + i];
      re[first + i] -= xr * b0r - xi * b0i;
      im[first + i] -= xr * b0i + xi * b0r;
      re[second + i] -= xr * b1r - xi * b1i;
      im[second + i] -= xr * b1i + xi * b1r;
    }
  }

  private subtractFromOne(k: number, j: number): void {
    const { re, im, order } = this.front;
    const target = j * order;
    const br = re[target + k];
    const bi = im[target + k];
    const column = k * order;
    for (let i = k + 1; i < order; i++) {
      const xr = re[column + i];
      const xi = im[column + i];
      re[target + i] -= xr * br - xi * bi;
      im[target + i] -= xr * bi + xi * br;
    }
  }

  /** Brings the columns from `end` on up to date with the pivots [begin, pivoted). */
  private updateBeyond(begin: number, pivoted: number, end: number): void {
    const { re, im, order } = this.front;
    const k = pivoted - begin;
    const columns = order - end;
    if (k === 0 || columns === 0) return;
    const block = (row: number, col: number): ComplexBlock => ({
      re,
      im,
      at: row + col * order,
      stride: order,
    });
    solveUnitLowerInPlace(block(begin, begin), block(begin, end), columns, k);
    subtractProductInto(
      block(pivoted, end),
      block(pivoted, begin),
      block(begin, end),
      order - pivoted,
      columns,
      k,
      false,
    );
  }

  /** Moves the rejected columns of the panel behind the other candidates. */
  private moveRejected(end: number, candidatesEnd: number): void {
    const swaps = Math.min(end - this.rejectedFrom, candidatesEnd - end);
    for (let t = 0; t < swaps; t++) this.swapColumns(this.rejectedFrom + t, candidatesEnd - 1 - t);
  }
}
