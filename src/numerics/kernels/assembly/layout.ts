/** Where the kernels keep their packed panels; what the caller places in the memory starts at `FREE`. */

export const PACKED_LEFT: usize = 1024;
export const PACKED_RIGHT: usize = PACKED_LEFT + 64 * 64 * 16;
export const FREE: usize = PACKED_RIGHT + 64 * 514 * 16;
