/**
 * Partial LDLᵀ of one dense symmetric front, lower triangle, with 1×1 and 2×2 pivots from the
 * fully summed part; columns without an acceptable pivot are left over for the parent front.
 *
 * Sources: Bunch & Kaufman, Math. Comp. 31(137), 1977; Duff & Reid, ACM TOMS 9(3), 1983
 * (threshold tests inside fronts); Bunch & Parlett, SIAM J. Numer. Anal. 8(4), 1971 (the
 * largest entry always yields a pivot).
 */

import type { PivotRule } from "./complex-front.js";
import { subtractRealProductInto } from "./real-kernels.js";

/** A symmetric front; column j starts at `j * order`, rows from j on are meant. */
export interface SymmetricFront {
  readonly values: Float64Array;
  readonly order: number;
  /** The first rows and columns, whose entries are complete. */
  readonly summed: number;
  /** Dofs of the rows and columns, permuted along with them. */
  readonly ids: Int32Array;
}

export interface SymmetricElimination {
  readonly pivots: number;
  readonly perturbed: number;
  /** D: at 2k the diagonal entry of pivot k, at 2k + 1 its coupling to pivot k + 1, 0 for a 1×1 pivot. */
  readonly diagonal: Float64Array;
}

/** Columns eliminated between two updates of the rest of the front. */
const PANEL = 32;
/** Columns of the rest updated at a time; what lies above the diagonal is wasted. */
const UPDATE_COLUMNS = 48;
/** No entry of L may exceed the inverse of this. */
const THRESHOLD = 0.01;
/** A diagonal entry is taken without looking for a 2×2 pivot from this share of its column on. */
const DIAGONAL_PREFERENCE = 0.1;

const REJECT = 0;
const CLOSE_PANEL = -1;

let updateRows = new Float64Array(0);

/** Leaves L (unit diagonal implied, blocks of D zeroed) in the first `pivots` columns, the update in the rest. */
export function eliminateSymmetricFront(front: SymmetricFront, rule: PivotRule): SymmetricElimination {
  return new SymmetricFrontElimination(front, rule).run();
}

class SymmetricFrontElimination {
  private readonly front: SymmetricFront;
  private readonly rule: PivotRule;
  private readonly diagonal: Float64Array;
  private readonly before: Float64Array;
  /** The columns from here to the end of the current panel have no acceptable pivot. */
  private rejectedFrom = 0;
  /** A root in which no column was accepted starts its next panel with the largest entry. */
  private forced = false;
  private perturbed = 0;

  constructor(front: SymmetricFront, rule: PivotRule) {
    this.front = front;
    this.rule = rule;
    this.diagonal = new Float64Array(2 * front.summed);
    this.before = new Float64Array(2 * front.order);
  }

  run(): SymmetricElimination {
    const { summed } = this.front;
    let done = 0;
    // Columns from here on were refused since the candidates were last gathered.
    let candidatesEnd = summed;
    let advanced = false;
    while (done < summed) {
      if (done >= candidatesEnd) {
        if (!advanced && !this.rule.isRoot) break;
        this.forced = !advanced;
        if (this.forced) this.bringLargestFirst(done);
        candidatesEnd = summed;
        advanced = false;
      }
      // Two columns at least, so that a 2×2 pivot fits.
      const end = Math.min(summed, Math.max(done + 2, Math.min(done + PANEL, candidatesEnd)));
      candidatesEnd = Math.max(candidatesEnd, end);
      const pivoted = this.eliminatePanel(done, end);
      this.updateBeyond(done, pivoted, end);
      this.moveRejected(end, candidatesEnd);
      candidatesEnd -= end - this.rejectedFrom;
      advanced = advanced || pivoted > done;
      done = pivoted;
    }
    return { pivots: done, perturbed: this.perturbed, diagonal: this.diagonal.slice(0, 2 * done) };
  }

  /** Eliminates what it can of the columns [begin, end); returns the end of the pivots. */
  private eliminatePanel(begin: number, end: number): number {
    let k = begin;
    this.rejectedFrom = end;
    while (k < this.rejectedFrom) {
      const size = this.choosePivot(k, k === begin, end);
      if (size === CLOSE_PANEL) break;
      if (size === REJECT) {
        this.rejectedFrom--;
        this.swap(k, this.rejectedFrom);
        continue;
      }
      if (size === 1) this.eliminateOne(k, end);
      else this.eliminateTwo(k, end);
      k += size;
    }
    this.rejectedFrom = Math.max(this.rejectedFrom, k);
    return k;
  }

  /** Size of the pivot to eliminate at k, after moving its partner to k + 1, or a refusal. */
  private choosePivot(k: number, current: boolean, end: number): number {
    const { values, order, summed } = this.front;
    const { tiny } = this.rule;
    const column = k * order;
    let partner = -1;
    let coupling = -1;
    for (let i = k + 1; i < summed; i++) {
      const m = Math.abs(values[column + i]);
      if (m > coupling) {
        coupling = m;
        partner = i;
      }
    }
    const offDiagonal = Math.max(coupling, this.largestBelow(k, summed), 0);
    const diagonal = Math.abs(values[column + k]);
    if (diagonal <= tiny && offDiagonal <= tiny) {
      values[column + k] = values[column + k] < 0 ? -tiny : tiny;
      this.perturbed++;
      return 1;
    }
    if (diagonal >= DIAGONAL_PREFERENCE * offDiagonal) return 1;
    if (coupling > tiny) {
      // Columns beyond the panel are up to date only at its start.
      if (partner >= end && !current) return CLOSE_PANEL;
      this.swap(k + 1, partner);
      if (this.acceptsPair(k)) return 2;
    }
    // The largest entry is refused only when it is not finite; the solve will report that.
    return diagonal >= THRESHOLD * offDiagonal || (this.forced && current) ? 1 : REJECT;
  }

  private largestBelow(k: number, from: number): number {
    const { values, order } = this.front;
    let largest = 0;
    for (let p = k * order + from; p < (k + 1) * order; p++) {
      const m = Math.abs(values[p]);
      if (m > largest) largest = m;
    }
    return largest;
  }

  /** |E⁻¹| (largest entries beside the block) ≤ 1/threshold, for the block E at k and k + 1. */
  private acceptsPair(k: number): boolean {
    const { values, order } = this.front;
    const a = values[k * (order + 1)];
    const b = values[k * (order + 1) + 1];
    const c = values[(k + 1) * (order + 1)];
    const determinant = Math.abs(a * c - b * b);
    if (determinant < THRESHOLD * Math.max(Math.abs(a * c), b * b)) return false;
    const first = this.largestBelow(k, k + 2);
    const second = this.largestBelow(k + 1, k + 2);
    const growth = Math.max(
      Math.abs(c) * first + Math.abs(b) * second,
      Math.abs(b) * first + Math.abs(a) * second,
    );
    return THRESHOLD * growth <= determinant;
  }

  /** Exchanges the dofs at positions a and b. */
  private swap(from: number, to: number): void {
    if (from === to) return;
    const { values, order, ids } = this.front;
    const a = Math.min(from, to);
    const b = Math.max(from, to);
    for (let c = 0; c < a; c++) exchange(values, a + c * order, b + c * order);
    exchange(values, a * (order + 1), b * (order + 1));
    for (let i = a + 1; i < b; i++) exchange(values, i + a * order, b + i * order);
    for (let i = b + 1; i < order; i++) exchange(values, i + a * order, i + b * order);
    const id = ids[a];
    ids[a] = ids[b];
    ids[b] = id;
  }

  private eliminateOne(k: number, end: number): void {
    const { values, order } = this.front;
    const { before } = this;
    const column = k * order;
    const d = values[column + k];
    this.diagonal[2 * k] = d;
    const inverse = 1 / d;
    for (let i = k + 1; i < order; i++) {
      before[i] = values[column + i];
      values[column + i] *= inverse;
    }
    for (let j = k + 1; j < end; j++) {
      const w = before[j];
      const target = j * order;
      for (let i = j; i < order; i++) values[target + i] -= values[column + i] * w;
    }
  }

  private eliminateTwo(k: number, end: number): void {
    const { values, order } = this.front;
    const { before } = this;
    const first = k * order;
    const second = first + order;
    const a = values[first + k];
    const b = values[first + k + 1];
    const c = values[second + k + 1];
    this.diagonal[2 * k] = a;
    this.diagonal[2 * k + 1] = b;
    this.diagonal[2 * k + 2] = c;
    values[first + k + 1] = 0;
    const determinant = a * c - b * b;
    for (let i = k + 2; i < order; i++) {
      const x = values[first + i];
      const y = values[second + i];
      before[i] = x;
      before[order + i] = y;
      values[first + i] = (c * x - b * y) / determinant;
      values[second + i] = (a * y - b * x) / determinant;
    }
    for (let j = k + 2; j < end; j++) {
      const x = before[j];
      const y = before[order + j];
      const target = j * order;
      for (let i = j; i < order; i++) values[target + i] -= values[first + i] * x + values[second + i] * y;
    }
  }

  /** Brings the columns from `end` on up to date with the pivots [begin, pivoted): A ← A − L (D Lᵀ). */
  private updateBeyond(begin: number, pivoted: number, end: number): void {
    const { values, order } = this.front;
    const k = pivoted - begin;
    if (k === 0 || end === order) return;
    const w = this.scaledRows(begin, k, end);
    for (let j = end; j < order; j += UPDATE_COLUMNS) {
      const cols = Math.min(UPDATE_COLUMNS, order - j);
      subtractRealProductInto(
        { values, at: j * (order + 1), stride: order },
        { values, at: j + begin * order, stride: order },
        { values: w, at: (j - end) * k, stride: k },
        order - j,
        cols,
        k,
        false,
      );
    }
  }

  /** D Lᵀ for the k pivots from `begin` and the rows of L from `end`, k×(order − end). */
  private scaledRows(begin: number, k: number, end: number): Float64Array {
    const { values, order } = this.front;
    const { diagonal } = this;
    if (updateRows.length < k * (order - end)) updateRows = new Float64Array(k * (order - end));
    for (let p = 0; p < k; p++) {
      const d = diagonal[2 * (begin + p)];
      const after = diagonal[2 * (begin + p) + 1];
      const prior = p > 0 ? diagonal[2 * (begin + p) - 1] : 0;
      const column = (begin + p) * order;
      for (let j = end, q = p; j < order; j++, q += k) {
        let w = d * values[column + j];
        if (after !== 0) w += after * values[column + order + j];
        if (prior !== 0) w += prior * values[column - order + j];
        updateRows[q] = w;
      }
    }
    return updateRows;
  }

  /** Moves the rejected columns of the panel behind the other candidates. */
  private moveRejected(end: number, candidatesEnd: number): void {
    const swaps = Math.min(end - this.rejectedFrom, candidatesEnd - end);
    for (let t = 0; t < swaps; t++) this.swap(this.rejectedFrom + t, candidatesEnd - 1 - t);
  }

  /** In a root the largest remaining entry gives a pivot whatever the others are. */
  private bringLargestFirst(done: number): void {
    const { values, order } = this.front;
    let largest = -1;
    let column = done;
    for (let j = done; j < order; j++) {
      for (let i = j; i < order; i++) {
        const m = Math.abs(values[i + j * order]);
        if (m > largest) {
          largest = m;
          column = j;
        }
      }
    }
    this.swap(done, column);
  }
}

function exchange(values: Float64Array, p: number, q: number): void {
  const x = values[p];
  values[p] = values[q];
  values[q] = x;
}
