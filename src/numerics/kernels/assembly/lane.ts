/** Lane of the kernels: a vector of two doubles. The build without vectors has `f64` here. */
export type Lane = v128;
