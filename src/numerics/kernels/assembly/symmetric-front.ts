/**
 * Partial LDLᵀ of one dense symmetric front, lower triangle, with 1×1 and 2×2 pivots from the
 * fully summed part; columns without an acceptable pivot are left over for the parent front.
 *
 * Sources: Bunch & Kaufman, Math. Comp. 31(137), 1977; Duff & Reid, ACM TOMS 9(3), 1983
 * (threshold tests inside fronts); Bunch & Parlett, SIAM J. Numer. Anal. 8(4), 1971 (the
 * largest entry always yields a pivot).
 */

import { subtractLargeRealProduct } from "./host";
import { Lane } from "./lane";
import { larger, largestLane, magnitude, widthOf, zero } from "./lanes";
import { subtractOne } from "./real-triangles";

/** Columns eliminated between two updates of the rest of the front, and between two of the panel. */
const PANEL: i32 = 96;
const BLOCK: i32 = 24;
/** Columns of the rest updated at a time; what lies above the diagonal is wasted. */
const UPDATE_COLUMNS: i32 = 60;
/** No entry of L may exceed the inverse of this. */
const THRESHOLD: f64 = 0.01;
/** A diagonal entry is taken without looking for a 2×2 pivot from this share of its column on. */
const DIAGONAL_PREFERENCE: f64 = 0.1;

const REJECT: i32 = 0;
const CLOSE_BLOCK: i32 = -1;
const CLOSE_PANEL: i32 = -2;

let values: usize = 0;
let order: i32 = 0;
let summed: i32 = 0;
let ids: usize = 0;
/** D: at 2k the diagonal entry of pivot k, at 2k + 1 its coupling to pivot k + 1, 0 for a 1×1 pivot. */
let diagonal: usize = 0;
/** Two columns before their division, then the scaled rows of an update. */
let before: usize = 0;
let scaled: usize = 0;
/** A pivot of at most this modulus is replaced by this value, when nothing better can come. */
let tiny: f64 = 0;
/** A root in which no column was accepted starts its next panel with the largest entry. */
let forced: bool = false;
let perturbed: i32 = 0;
/** Columns from here to the end of the block have no acceptable pivot. */
let rejectedFrom: i32 = 0;
let closed: bool = false;

/** Replaced pivots of the last front. */
export function perturbedSymmetricPivots(): i32 {
  return perturbed;
}

/** Doubles of scratch that a front of this order needs. */
export function symmetricScratch(frontOrder: i32): i32 {
  return 2 * frontOrder + PANEL * UPDATE_COLUMNS;
}

function at(row: i32, column: i32): usize {
  return values + ((<usize>(row + column * order)) << 3);
}

/**
 * Leaves L (unit diagonal implied, blocks of D zeroed) in the first columns, the update in the
 * rest, D in `frontDiagonal` (2·summed); column j starts at `j · order`, rows from j on are meant.
 *
 * @returns The number of pivots.
 */
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
  values = front;
  order = frontOrder;
  summed = frontSummed;
  ids = frontIds;
  diagonal = frontDiagonal;
  before = scratch;
  scaled = scratch + ((<usize>order) << 4);
  tiny = tinyPivot;
  forced = false;
  perturbed = 0;
  memory.fill(diagonal, 0, (<usize>summed) << 4);
  let done = 0;
  // Columns from here on were refused since the candidates were last gathered.
  let candidatesEnd = summed;
  let advanced = false;
  while (done < summed) {
    if (done >= candidatesEnd) {
      if (!advanced && !isRoot) break;
      forced = !advanced;
      if (forced) bringLargestFirst(done);
      candidatesEnd = summed;
      advanced = false;
    }
    // Two columns at least, so that a 2×2 pivot fits.
    const end = min(summed, max(done + 2, min(done + PANEL, candidatesEnd)));
    candidatesEnd = max(candidatesEnd, end);
    const pivoted = eliminatePanel(done, end);
    bringUpToDate(done, pivoted, end, order);
    const active = rejectedFrom;
    moveBehind(active, end, candidatesEnd);
    candidatesEnd -= end - active;
    advanced = advanced || pivoted > done;
    done = pivoted;
  }
  return done;
}

/** Eliminates what it can of the columns [begin, end), block by block; `rejectedFrom` tells which are left. */
function eliminatePanel(begin: i32, end: i32): i32 {
  let k = begin;
  let active = end;
  closed = false;
  while (k < active && !closed) {
    const blockEnd = min(end, max(k + 2, min(k + BLOCK, active)));
    active = max(active, blockEnd);
    const pivoted = eliminateBlock(k, blockEnd, begin, end);
    bringUpToDate(k, pivoted, blockEnd, end);
    moveBehind(rejectedFrom, blockEnd, active);
    active -= blockEnd - rejectedFrom;
    k = pivoted;
  }
  rejectedFrom = max(active, k);
  return k;
}

/** Eliminates what it can of the columns [begin, end), which alone are kept up to date; rejected ones end up last. */
function eliminateBlock(begin: i32, end: i32, panelBegin: i32, panelEnd: i32): i32 {
  let k = begin;
  rejectedFrom = end;
  while (k < rejectedFrom) {
    // Columns up to here may serve as partners.
    const currentEnd = k === panelBegin ? summed : k === begin ? panelEnd : end;
    const size = choosePivot(k, currentEnd, panelEnd);
    if (size < 0) {
      closed = size === CLOSE_PANEL;
      // What stays in the block is taken up again by the next one.
      rejectedFrom = end;
      break;
    }
    if (size === REJECT) {
      rejectedFrom--;
      swap(k, rejectedFrom);
      continue;
    }
    if (size === 1) eliminateOne(k, end);
    else eliminateTwo(k, end);
    k += size;
  }
  rejectedFrom = max(rejectedFrom, k);
  return k;
}

/** Size of the pivot to eliminate at k, after moving its partner to k + 1, or a refusal. */
function choosePivot(k: i32, currentEnd: i32, panelEnd: i32): i32 {
  const size = abs<f64>(load<f64>(at(k, k)));
  const offDiagonal = largestBelow(k, k + 1);
  if (size <= tiny && offDiagonal <= tiny) {
    store<f64>(at(k, k), load<f64>(at(k, k)) < 0 ? -tiny : tiny);
    perturbed++;
    return 1;
  }
  if (size >= DIAGONAL_PREFERENCE * offDiagonal) return 1;
  const partner = strongestPartner(k);
  if (partner >= 0 && abs<f64>(load<f64>(at(partner, k))) > tiny) {
    if (partner >= panelEnd && partner >= currentEnd) return CLOSE_PANEL;
    if (partner >= currentEnd) return CLOSE_BLOCK;
    swap(k + 1, partner);
    if (acceptsPair(k)) return 2;
  }
  // The largest entry is refused only when it is not finite; the solve will report that.
  return size >= THRESHOLD * offDiagonal || (forced && currentEnd === summed) ? 1 : REJECT;
}

/** The fully summed row below k of largest modulus in column k, −1 without any. */
function strongestPartner(k: i32): i32 {
  let best: f64 = -1;
  let partner = -1;
  for (let i = k + 1; i < summed; i++) {
    const modulus = abs<f64>(load<f64>(at(i, k)));
    if (modulus > best) {
      best = modulus;
      partner = i;
    }
  }
  return partner;
}

/** Largest modulus of column k in the rows from `from` on; NaN is passed over. */
function largestBelow(k: i32, from: i32): f64 {
  const width = widthOf();
  let best = zero();
  let i = from;
  for (; i + width <= order; i += width) best = larger(best, magnitude(load<Lane>(at(i, k))));
  let result = largestLane(best);
  for (; i < order; i++) {
    const modulus = abs<f64>(load<f64>(at(i, k)));
    if (modulus > result) result = modulus;
  }
  return result;
}

/** |E⁻¹| (largest entries beside the block) ≤ 1/threshold, for the block E at k and k + 1. */
function acceptsPair(k: i32): bool {
  const a = load<f64>(at(k, k));
  const b = load<f64>(at(k + 1, k));
  const c = load<f64>(at(k + 1, k + 1));
  const determinant = abs<f64>(a * c - b * b);
  if (determinant < THRESHOLD * max<f64>(abs<f64>(a * c), b * b)) return false;
  const first = largestBelow(k, k + 2);
  const second = largestBelow(k + 1, k + 2);
  const one = abs<f64>(c) * first + abs<f64>(b) * second;
  const two = abs<f64>(b) * first + abs<f64>(a) * second;
  return THRESHOLD * max<f64>(one, two) <= determinant;
}

function exchange(p: usize, q: usize): void {
  const x = load<f64>(p);
  store<f64>(p, load<f64>(q));
  store<f64>(q, x);
}

/** Exchanges the dofs at two positions. */
function swap(from: i32, to: i32): void {
  if (from === to) return;
  const a = min(from, to);
  const b = max(from, to);
  for (let c = 0; c < a; c++) exchange(at(a, c), at(b, c));
  exchange(at(a, a), at(b, b));
  for (let i = a + 1; i < b; i++) exchange(at(i, a), at(b, i));
  for (let i = b + 1; i < order; i++) exchange(at(i, a), at(i, b));
  const p = ids + ((<usize>a) << 2);
  const q = ids + ((<usize>b) << 2);
  const id = load<i32>(p);
  store<i32>(p, load<i32>(q));
  store<i32>(q, id);
}

/** Moves the columns [from, end) behind the other candidates [end, last). */
function moveBehind(from: i32, end: i32, last: i32): void {
  const swaps = min(end - from, last - end);
  for (let t = 0; t < swaps; t++) swap(from + t, last - 1 - t);
}

function eliminateOne(k: i32, end: i32): void {
  const d = load<f64>(at(k, k));
  store<f64>(diagonal + ((<usize>k) << 4), d);
  const inverse = 1 / d;
  const column = at(0, k);
  for (let i = (<usize>(k + 1)) << 3; i < (<usize>order) << 3; i += 8) {
    const x = load<f64>(column + i);
    store<f64>(before + i, x);
    store<f64>(column + i, x * inverse);
  }
  for (let j = k + 1; j < end; j++) {
    subtractOne(at(j, j), at(j, k), load<f64>(before + ((<usize>j) << 3)), order - j);
  }
}

function eliminateTwo(k: i32, end: i32): void {
  const a = load<f64>(at(k, k));
  const b = load<f64>(at(k + 1, k));
  const c = load<f64>(at(k + 1, k + 1));
  const d = diagonal + ((<usize>k) << 4);
  store<f64>(d, a);
  store<f64>(d, b, 8);
  store<f64>(d, c, 16);
  store<f64>(at(k + 1, k), 0);
  const determinant = a * c - b * b;
  const first = at(0, k);
  const second = at(0, k + 1);
  const other = before + ((<usize>order) << 3);
  for (let i = (<usize>(k + 2)) << 3; i < (<usize>order) << 3; i += 8) {
    const x = load<f64>(first + i);
    const y = load<f64>(second + i);
    store<f64>(before + i, x);
    store<f64>(other + i, y);
    store<f64>(first + i, (c * x - b * y) / determinant);
    store<f64>(second + i, (a * y - b * x) / determinant);
  }
  for (let j = k + 2; j < end; j++) {
    const w = (<usize>j) << 3;
    subtractOne(at(j, j), at(j, k), load<f64>(before + w), order - j);
    subtractOne(at(j, j), at(j, k + 1), load<f64>(other + w), order - j);
  }
}

/** Brings the columns [from, to) up to date with the pivots [begin, pivoted): A ← A − L (D Lᵀ). */
function bringUpToDate(begin: i32, pivoted: i32, from: i32, to: i32): void {
  const k = pivoted - begin;
  if (k === 0) return;
  for (let j = from; j < to; j += UPDATE_COLUMNS) {
    const columns = min(UPDATE_COLUMNS, to - j);
    scaleRows(begin, k, j, columns);
    subtractLargeRealProduct(at(j, j), order, at(j, begin), order, scaled, k, order - j, columns, k);
  }
}

/** D Lᵀ for the k pivots from `begin` and these rows of L, k×columns. */
function scaleRows(begin: i32, k: i32, from: i32, columns: i32): void {
  for (let p = 0; p < k; p++) {
    const pivot = begin + p;
    const d = load<f64>(diagonal + ((<usize>pivot) << 4));
    const after = load<f64>(diagonal + ((<usize>pivot) << 4), 8);
    const prior = p > 0 ? load<f64>(diagonal + ((<usize>(pivot - 1)) << 4), 8) : 0;
    for (let t = 0; t < columns; t++) {
      let w = d * load<f64>(at(from + t, pivot));
      if (after !== 0) w += after * load<f64>(at(from + t, pivot + 1));
      if (prior !== 0) w += prior * load<f64>(at(from + t, pivot - 1));
      store<f64>(scaled + ((<usize>(p + t * k)) << 3), w);
    }
  }
}

/** In a root the largest remaining entry gives a pivot whatever the others are. */
function bringLargestFirst(done: i32): void {
  let largest: f64 = -1;
  let column = done;
  for (let j = done; j < order; j++) {
    for (let i = j; i < order; i++) {
      const modulus = abs<f64>(load<f64>(at(i, j)));
      if (modulus > largest) {
        largest = modulus;
        column = j;
      }
    }
  }
  swap(done, column);
}
