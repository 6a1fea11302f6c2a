import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { ProblemFile } from "../problem/problem-file.js";

/** How a matrix is stored in a Matrix Market file; the matrix itself always holds all its entries. */
export type Symmetry = "general" | "symmetric" | "skew-symmetric";

export interface SampleMatrix {
  readonly matrix: SparseMatrix;
  readonly symmetry: Symmetry;
}

/** A demonstration problem as plain data: the problem file and the matrix files that it names. */
export interface SampleModel {
  /** Also the stem of the problem file's name. */
  readonly name: string;
  readonly problem: ProblemFile;
  /** By file name, as `problem.matrices` has them. */
  readonly matrices: ReadonlyMap<string, SampleMatrix>;
}
