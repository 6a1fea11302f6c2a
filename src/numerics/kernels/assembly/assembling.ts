/** Updates on their way from a child's front to its parent's: added by places, and packed together. */

/** target[places[i], places[j]] += update[i, j] for a size×size update; `places` holds 32-bit integers. */
export function addSquareUpdate(target: usize, stride: i32, update: usize, size: i32, places: usize): void {
  for (let j = 0; j < size; j++) {
    const column = target + ((<usize>(load<i32>(places + ((<usize>j) << 2)) * stride)) << 3);
    for (let i = 0; i < size; i++, update += 8) {
      const at = column + ((<usize>load<i32>(places + ((<usize>i) << 2))) << 3);
      store<f64>(at, load<f64>(at) + load<f64>(update));
    }
  }
}

/** The same for the lower triangle of a symmetric update, of which only columns before `crossing` may end up above the diagonal. */
export function addLowerUpdate(
  target: usize,
  stride: i32,
  update: usize,
  size: i32,
  places: usize,
  crossing: i32,
): void {
  for (let j = 0; j < size; j++) {
    const column = load<i32>(places + ((<usize>j) << 2));
    for (let i = j; i < size; i++, update += 8) {
      const row = load<i32>(places + ((<usize>i) << 2));
      const place = j < crossing && row < column ? column + row * stride : row + column * stride;
      const at = target + ((<usize>place) << 3);
      store<f64>(at, load<f64>(at) + load<f64>(update));
    }
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
