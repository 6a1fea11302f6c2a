/** Moves between fronts and what lies around them: updates added by places and packed together, rows of right-hand sides. */

import { Lane } from "./lane";
import { add } from "./lanes";

/**
 * target[places[i], places[j]] += update[i, j] for a size×size update; `places` holds 32-bit integers.
 *
 * @param runs - Scratch of as many integers.
 */
export function addSquareUpdate(
  target: usize,
  stride: i32,
  update: usize,
  size: i32,
  places: usize,
  runs: usize,
): void {
  measureRuns(runs, places, size);
  for (let j = 0; j < size; j++) {
    const column = target + ((<usize>(load<i32>(places + ((<usize>j) << 2)) * stride)) << 3);
    addColumn(column, update, 0, size, places, runs);
    update += (<usize>size) << 3;
  }
}

/** The same for the lower triangle of a symmetric update, of which only columns before `crossing` may end up above the diagonal. */
export function addLowerUpdate(
  target: usize,
  stride: i32,
  update: usize,
  size: i32,
  places: usize,
  runs: usize,
  crossing: i32,
): void {
  measureRuns(runs, places, size);
  for (let j = 0; j < size; j++) {
    const column = load<i32>(places + ((<usize>j) << 2));
    if (j < crossing) {
      for (let i = j; i < size; i++) {
        const row = load<i32>(places + ((<usize>i) << 2));
        const place = row < column ? column + row * stride : row + column * stride;
        const at = target + ((<usize>place) << 3);
        store<f64>(at, load<f64>(at) + load<f64>(update + ((<usize>(i - j)) << 3)));
      }
    } else addColumn(target + ((<usize>(column * stride)) << 3), update, j, size, places, runs);
    update += (<usize>(size - j)) << 3;
  }
}

/** At each place the number of consecutive places that start there: mostly long runs, since fronts share orders. */
function measureRuns(runs: usize, places: usize, size: i32): void {
  let run = 0;
  let after = -1;
  for (let i = size - 1; i >= 0; i--) {
    const place = load<i32>(places + ((<usize>i) << 2));
    run = place + 1 === after ? run + 1 : 1;
    store<i32>(runs + ((<usize>i) << 2), run);
    after = place;
  }
}

/** Adds the rows [from, to) of an update's column, which stand together from `update` on. */
function addColumn(column: usize, update: usize, from: i32, to: i32, places: usize, runs: usize): void {
  const width = sizeof<Lane>();
  for (let i = from; i < to; ) {
    const run = load<i32>(runs + ((<usize>i) << 2));
    let at = column + ((<usize>load<i32>(places + ((<usize>i) << 2))) << 3);
    const end = at + ((<usize>run) << 3);
    for (; at + width <= end; at += width, update += width) {
      store<Lane>(at, add(load<Lane>(at), load<Lane>(update)));
    }
    for (; at < end; at += 8, update += 8) store<f64>(at, load<f64>(at) + load<f64>(update));
    i += run;
  }
}

/** Moves the trailing size×size block of a front to `to`, which lies before it. */
export function packSquare(to: usize, from: usize, stride: i32, size: i32): void {
  const bytes = (<usize>size) << 3;
  for (let j = 0; j < size; j++) {
    memory.copy(to, from, bytes);
    to += bytes;
    from += (<usize>stride) << 3;
  }
}

/** The same for the lower triangle alone, column after column without gaps. */
export function packLower(to: usize, from: usize, stride: i32, size: i32): void {
  for (let j = 0; j < size; j++) {
    const bytes = (<usize>(size - j)) << 3;
    memory.copy(to, from, bytes);
    to += bytes;
    from += (<usize>(stride + 1)) << 3;
  }
}

/** Gathers the first `rows` rows of these columns at `to`, which lies before `from`. */
export function packRows(to: usize, from: usize, stride: i32, rows: i32, columns: i32): void {
  const bytes = (<usize>rows) << 3;
  for (let j = 0; j < columns; j++) {
    for (let i: usize = 0; i < bytes; i += 8) store<f64>(to + i, load<f64>(from + i));
    to += bytes;
    from += (<usize>stride) << 3;
  }
}

/** Rows of a row-major array, by their numbers in `ids` (32-bit), into a column-major block. */
export function gatherRows(to: usize, stride: i32, from: usize, columns: i32, ids: usize, count: i32): void {
  const step = (<usize>stride) << 3;
  for (let i = 0; i < count; i++) {
    let source = from + ((<usize>(load<i32>(ids + ((<usize>i) << 2)) * columns)) << 3);
    let target = to + ((<usize>i) << 3);
    for (let c = 0; c < columns; c++) {
      store<f64>(target, load<f64>(source));
      source += 8;
      target += step;
    }
  }
}

/** The other way round. */
export function scatterRows(to: usize, columns: i32, ids: usize, from: usize, stride: i32, count: i32): void {
  const step = (<usize>stride) << 3;
  for (let i = 0; i < count; i++) {
    let target = to + ((<usize>(load<i32>(ids + ((<usize>i) << 2)) * columns)) << 3);
    let source = from + ((<usize>i) << 3);
    for (let c = 0; c < columns; c++) {
      store<f64>(target, load<f64>(source));
      target += 8;
      source += step;
    }
  }
}

/** Zeros from `at` up to `end`. */
export function clear(at: usize, end: usize): void {
  memory.fill(at, 0, end - at);
}
