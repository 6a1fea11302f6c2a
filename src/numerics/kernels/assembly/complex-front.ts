/**
 * Partial LU of one dense complex front with threshold pivoting. Pivots come from the fully
 * summed rows and columns; columns without an acceptable pivot are left over for the parent.
 *
 * Source: Duff & Reid, ACM TOMS 9(3), 1983 (delayed pivots); Li & Demmel, ACM TOMS 29(2),
 * 2003 (replacing tiny pivots).
 */

import { solveComplexUnitLower, subtractOne } from "./complex-triangles";
import { subtractLargeComplexProduct } from "./host";
import { Lane } from "./lane";
import { larger, largestLane, multiply, multiplyAdd, multiplySubtract, splat, widthOf, zero } from "./lanes";

/** Columns eliminated between two updates of the rest of the front, and between two of the panel. */
const PANEL: i32 = 96;
const BLOCK: i32 = 24;
/** A pivot must reach this share of its column (squared). */
const THRESHOLD: f64 = 0.01 * 0.01;
/** The diagonal is taken, without looking further, from this share on (squared). */
const DIAGONAL_PREFERENCE: f64 = 0.1 * 0.1;

const REJECT: i32 = -1;
const CLOSE_PANEL: i32 = -2;

let re: usize = 0;
let im: usize = 0;
let order: i32 = 0;
let summed: i32 = 0;
let rowIds: usize = 0;
let colIds: usize = 0;
/** A pivot of at most this modulus is replaced by this value, when nothing better can come. */
let tiny: f64 = 0;
/** Only negligible columns are left in a root. */
let forced: bool = false;
/** Columns from here to the end of the block have no acceptable pivot. */
let rejectedFrom: i32 = 0;
let closed: bool = false;

/**
 * Leaves L (unit diagonal implied) and U in the first columns and rows, the update in the rest;
 * column j starts at `j · order`. The ids of rows and columns are permuted along.
 *
 * @returns The number of pivots.
 */
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
  re = frontRe;
  im = frontIm;
  order = frontOrder;
  summed = frontSummed;
  rowIds = frontRowIds;
  colIds = frontColIds;
  tiny = tinyPivot;
  forced = false;
  let done = 0;
  // Columns from here on were refused since the candidates were last gathered.
  let candidatesEnd = summed;
  let advanced = false;
  while (done < summed) {
    if (done === candidatesEnd) {
      if (!advanced && !isRoot) break;
      forced = !advanced;
      candidatesEnd = summed;
      advanced = false;
    }
    const end = min(done + PANEL, candidatesEnd);
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
    const blockEnd = min(k + BLOCK, active);
    const pivoted = eliminateBlock(k, blockEnd, begin);
    bringUpToDate(k, pivoted, blockEnd, end);
    moveBehind(rejectedFrom, blockEnd, active);
    active -= blockEnd - rejectedFrom;
    k = pivoted;
  }
  rejectedFrom = active;
  return k;
}

/** Eliminates what it can of the columns [begin, end), which alone are kept up to date; rejected ones end up last. */
function eliminateBlock(begin: i32, end: i32, panelBegin: i32): i32 {
  let k = begin;
  rejectedFrom = end;
  while (k < rejectedFrom) {
    const row = choosePivotRow(k, k === panelBegin);
    if (row === CLOSE_PANEL) {
      closed = true;
      // What stays in the block is taken up again by the next panel.
      rejectedFrom = end;
      break;
    }
    if (row === REJECT) {
      rejectedFrom--;
      swapColumns(k, rejectedFrom);
      continue;
    }
    swapRows(k, row);
    eliminateColumn(k, end);
    k++;
  }
  return k;
}

/** Row of the pivot for column k, or a refusal. `current` tells that the whole row k is up to date. */
function choosePivotRow(k: i32, current: bool): i32 {
  const column = (<usize>(k * order)) << 3;
  const largest = largestSquare(re + column, im + column, k, order);
  if (largest <= tiny * tiny) {
    if (forced) return perturb(k, largestRow(column, k));
    if (!current) return CLOSE_PANEL;
    return rowIsNegligible(k) ? perturb(k, k) : REJECT;
  }
  const diagonal = squareAt(column + ((<usize>k) << 3));
  if (diagonal >= DIAGONAL_PREFERENCE * largest) return k;
  const row = largestRow(column, k);
  return squareAt(column + ((<usize>row) << 3)) >= THRESHOLD * largest ? row : REJECT;
}

function squareAt(at: usize): f64 {
  const x = load<f64>(re + at);
  const y = load<f64>(im + at);
  return x * x + y * y;
}

/** Largest squared modulus of the rows [from, to) of a column; NaN is passed over. */
function largestSquare(columnRe: usize, columnIm: usize, from: i32, to: i32): f64 {
  const width = widthOf();
  let best = zero();
  let i = from;
  for (; i + width <= to; i += width) {
    const at = (<usize>i) << 3;
    const x = load<Lane>(columnRe + at);
    const y = load<Lane>(columnIm + at);
    best = larger(best, multiplyAdd(y, y, multiply(x, x)));
  }
  let result = largestLane(best);
  for (; i < to; i++) {
    const at = (<usize>i) << 3;
    const x = load<f64>(columnRe + at);
    const y = load<f64>(columnIm + at);
    const square = x * x + y * y;
    if (square > result) result = square;
  }
  return result;
}

/** The fully summed row, from k on, of largest modulus in a column. */
function largestRow(column: usize, k: i32): i32 {
  let best: f64 = -1;
  let row = k;
  for (let i = k; i < summed; i++) {
    const square = squareAt(column + ((<usize>i) << 3));
    if (square > best) {
      best = square;
      row = i;
    }
  }
  return row;
}

function perturb(k: i32, row: i32): i32 {
  const at = (<usize>(k * order + row)) << 3;
  store<f64>(re + at, tiny);
  store<f64>(im + at, 0);
  return row;
}

function rowIsNegligible(k: i32): bool {
  for (let j = k + 1; j < order; j++) {
    if (squareAt((<usize>(j * order + k)) << 3) > tiny * tiny) return false;
  }
  return true;
}

function exchange(p: usize, q: usize): void {
  const x = load<f64>(p);
  store<f64>(p, load<f64>(q));
  store<f64>(q, x);
}

function exchangeIds(ids: usize, a: i32, b: i32): void {
  const p = ids + ((<usize>a) << 2);
  const q = ids + ((<usize>b) << 2);
  const id = load<i32>(p);
  store<i32>(p, load<i32>(q));
  store<i32>(q, id);
}

function swapColumns(a: i32, b: i32): void {
  if (a === b) return;
  for (let i = 0; i < order; i++) {
    const p = (<usize>(a * order + i)) << 3;
    const q = (<usize>(b * order + i)) << 3;
    exchange(re + p, re + q);
    exchange(im + p, im + q);
  }
  exchangeIds(colIds, a, b);
}

function swapRows(a: i32, b: i32): void {
  if (a === b) return;
  for (let j = 0; j < order; j++) {
    const p = (<usize>(j * order + a)) << 3;
    const q = (<usize>(j * order + b)) << 3;
    exchange(re + p, re + q);
    exchange(im + p, im + q);
  }
  exchangeIds(rowIds, a, b);
}

/** Moves the columns [from, end) behind the other candidates [end, last). */
function moveBehind(from: i32, end: i32, last: i32): void {
  const swaps = min(end - from, last - end);
  for (let t = 0; t < swaps; t++) swapColumns(from + t, last - 1 - t);
}

/** Divides column k by its pivot and subtracts it from the columns up to `end`. */
function eliminateColumn(k: i32, end: i32): void {
  const column = (<usize>(k * order)) << 3;
  scaleColumn(column, k);
  let j = k + 1;
  for (; j + 1 < end; j += 2) subtractFromPair(k, column, (<usize>(j * order)) << 3);
  if (j < end) {
    const target = (<usize>(j * order + k)) << 3;
    const source = column + ((<usize>(k + 1)) << 3);
    const br = load<f64>(re + target);
    const bi = load<f64>(im + target);
    subtractOne(re + target + 8, im + target + 8, re + source, im + source, br, bi, order - k - 1);
  }
}

function scaleColumn(column: usize, k: i32): void {
  const width = widthOf();
  const pivot = column + ((<usize>k) << 3);
  const pr = load<f64>(re + pivot);
  const pi = load<f64>(im + pivot);
  const d = 1 / (pr * pr + pi * pi);
  const qr = pr * d;
  const qi = -pi * d;
  const vr = splat(qr);
  const vi = splat(qi);
  const r = re + column;
  const s = im + column;
  let i = k + 1;
  for (; i + width <= order; i += width) {
    const at = (<usize>i) << 3;
    const x = load<Lane>(r + at);
    const y = load<Lane>(s + at);
    store<Lane>(r + at, multiplySubtract(y, vi, multiply(x, vr)));
    store<Lane>(s + at, multiplyAdd(y, vr, multiply(x, vi)));
  }
  for (; i < order; i++) {
    const at = (<usize>i) << 3;
    const x = load<f64>(r + at);
    const y = load<f64>(s + at);
    store<f64>(r + at, x * qr - y * qi);
    store<f64>(s + at, x * qi + y * qr);
  }
}

/** The column at `target` and its neighbour, below row k, less the column at `source` times their entries in row k. */
function subtractFromPair(k: i32, source: usize, target: usize): void {
  const width = widthOf();
  const step = (<usize>order) << 3;
  const row = (<usize>k) << 3;
  const b0r = load<f64>(re + target + row);
  const b0i = load<f64>(im + target + row);
  const b1r = load<f64>(re + target + step + row);
  const b1i = load<f64>(im + target + step + row);
  const v0r = splat(b0r);
  const v0i = splat(b0i);
  const v1r = splat(b1r);
  const v1i = splat(b1i);
  const xr = re + source;
  const xi = im + source;
  const yr = re + target;
  const yi = im + target;
  const zr = yr + step;
  const zi = yi + step;
  let i = k + 1;
  for (; i + width <= order; i += width) {
    const at = (<usize>i) << 3;
    const ar = load<Lane>(xr + at);
    const ai = load<Lane>(xi + at);
    store<Lane>(yr + at, multiplyAdd(ai, v0i, multiplySubtract(ar, v0r, load<Lane>(yr + at))));
    store<Lane>(yi + at, multiplySubtract(ai, v0r, multiplySubtract(ar, v0i, load<Lane>(yi + at))));
    store<Lane>(zr + at, multiplyAdd(ai, v1i, multiplySubtract(ar, v1r, load<Lane>(zr + at))));
    store<Lane>(zi + at, multiplySubtract(ai, v1r, multiplySubtract(ar, v1i, load<Lane>(zi + at))));
  }
  for (; i < order; i++) {
    const at = (<usize>i) << 3;
    const ar = load<f64>(xr + at);
    const ai = load<f64>(xi + at);
    store<f64>(yr + at, load<f64>(yr + at) - (ar * b0r - ai * b0i));
    store<f64>(yi + at, load<f64>(yi + at) - (ar * b0i + ai * b0r));
    store<f64>(zr + at, load<f64>(zr + at) - (ar * b1r - ai * b1i));
    store<f64>(zi + at, load<f64>(zi + at) - (ar * b1i + ai * b1r));
  }
}

/** Brings the columns [from, to) up to date with the pivots [begin, pivoted). */
function bringUpToDate(begin: i32, pivoted: i32, from: i32, to: i32): void {
  const k = pivoted - begin;
  const columns = to - from;
  if (k === 0 || columns <= 0) return;
  const lower = (<usize>(begin + begin * order)) << 3;
  const right = (<usize>(begin + from * order)) << 3;
  solveComplexUnitLower(re + lower, im + lower, order, re + right, im + right, order, columns, k);
  const rows = (<usize>k) << 3;
  subtractLargeComplexProduct(
    re + right + rows,
    im + right + rows,
    order,
    re + lower + rows,
    im + lower + rows,
    order,
    re + right,
    im + right,
    order,
    order - pivoted,
    columns,
    k,
  );
}
