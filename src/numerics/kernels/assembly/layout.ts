/** Where the kernels keep their packed panels; what the caller places in the memory starts at `FREE`. */

/** Depth, rows and columns packed at a time; both stay in the second-level cache. Columns fill whole tiles. */
export const DEPTH: i32 = 96;
export const ROWS: i32 = 64;
export const COLUMNS: i32 = 240;

/** Columns of a tile of the result; its rows are two vectors. Separate products and sums need more registers. */
export const TILE_COLUMNS: i32 = ASC_FEATURE_RELAXED_SIMD ? 6 : 4;

const LEFT_BYTES: usize = (<usize>(DEPTH * ROWS)) << 3;
const RIGHT_BYTES: usize = (<usize>(DEPTH * COLUMNS)) << 3;
const TILE_BYTES: usize = 6 * 4 * 8;

/** Three planes each: of a complex matrix the real parts, the imaginary parts, and their sums. */
export const LEFT: usize = 1024;
export const LEFT_SECOND: usize = LEFT + LEFT_BYTES;
export const LEFT_THIRD: usize = LEFT_SECOND + LEFT_BYTES;
export const RIGHT: usize = LEFT_THIRD + LEFT_BYTES;
export const RIGHT_SECOND: usize = RIGHT + RIGHT_BYTES;
export const RIGHT_THIRD: usize = RIGHT_SECOND + RIGHT_BYTES;
export const TILE: usize = RIGHT_THIRD + RIGHT_BYTES;
export const TILE_SECOND: usize = TILE + TILE_BYTES;
export const TILE_THIRD: usize = TILE_SECOND + TILE_BYTES;
export const FREE: usize = TILE_THIRD + TILE_BYTES;
