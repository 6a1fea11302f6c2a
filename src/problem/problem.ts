/**
 * A problem as plain data in SI units: what reading a problem file gives and what the model is
 * built from. Dofs and indices count from 0 here, from 1 in the files.
 */

import type { Step } from "./formula-program.js";

/** A sparse matrix by entries; duplicates are added by whoever assembles it. Symmetric files stand expanded. */
export interface Triplets {
  readonly rows: number;
  readonly cols: number;
  readonly row: Int32Array;
  readonly col: Int32Array;
  readonly value: Float64Array;
}

/** A scalar formula of named values. */
export interface Formula {
  readonly text: string;
  /** The names it uses, each once, in order of appearance. */
  readonly names: readonly string[];
  /** The same as plain data: steps in postfix order, from which `programFormula` makes it again. */
  readonly steps: readonly Step[];
  /** The value; NaN or infinite where the formula is undefined. Every used name must be in `values`. */
  evaluate(values: ReadonlyMap<string, number>): number;
  /** Exact partial derivative with respect to one name; 0 for a name it does not use. */
  derivative(name: string, values: ReadonlyMap<string, number>): number;
}

export interface NamedMatrix {
  readonly name: string;
  readonly form: "file" | "entries" | "links" | "outer";
  readonly triplets: Triplets;
  /** Only of `outer`: the columns of left and right (n×m each), so that the matrix is left·rightᵀ. */
  readonly left?: Triplets;
  readonly right?: Triplets;
}

export type TermGroup = "mass" | "damping" | "gyroscopic" | "stiffness" | "circulatory" | "frictional";

/** One addend φ·A of one of the six model matrices. */
export interface Term {
  readonly group: TermGroup;
  /** Name of A in `Problem.matrices`. */
  readonly matrix: string;
  /** Label in reports: the given name, or the matrix's. */
  readonly name: string;
  readonly factor: Formula;
  /** The factor holds up to this frequency [Hz]; null: at all. */
  readonly validToHz: number | null;
  /** JSON pointer of the term in the problem file. */
  readonly pointer: string;
}

/** A design variable. */
export interface Variable {
  readonly name: string;
  readonly low: number;
  readonly high: number;
  readonly start: number;
  /** Purchasable step counted from `low`; null: any value. */
  readonly step: number | null;
  readonly unit: string;
}

export interface OperatingParameter {
  readonly name: string;
  readonly low: number;
  readonly high: number;
  readonly nominal: number;
  readonly unit: string;
}

/** One block of model error s^k·(size·B)·Δ·C with k = 0 (stiffness) or 1 (damping). */
export interface Perturbation {
  readonly name: string;
  readonly acts: "stiffness" | "damping";
  readonly kind: "complex" | "real" | "scalar" | "symmetric";
  readonly size: Formula;
  /** B, n×m; null: the identity. */
  readonly left: Triplets | null;
  /** C, p×n; null: the identity. */
  readonly right: Triplets | null;
}

/** A formula of the design that must stay at or below `limit`. */
export interface Limit {
  readonly name: string;
  readonly formula: Formula;
  readonly limit: number;
  readonly unit: string;
}

export interface MarginSettings {
  readonly measure: "radius" | "multiplier" | "decay";
  readonly as: "rate" | "ratio" | "logDecrement";
  /** Names of the terms that the multiplier scales; null: all circulatory and frictional ones. */
  readonly terms: readonly string[] | null;
  /** [low, high] in Hz; null: all frequencies. */
  readonly bandHz: readonly [number, number] | null;
  readonly target: number | null;
}

export interface TuneSettings {
  readonly seed: number;
  /** Agreement wanted between reduced and full margin, relative to the larger of margin and target (without one, see `settingOf`). */
  readonly tolerance: number;
}

/** A file that was read, for the record of a result. */
export interface InputFile {
  /** Relative to the problem file's folder, with forward slashes. */
  readonly path: string;
  /** Hexadecimal digest of the bytes on disk (compressed ones where compressed). */
  readonly sha256: string;
  readonly bytes: number;
}

export interface Problem {
  readonly title: string;
  readonly notes: string | null;
  /** Path of the problem file as it was given. */
  readonly path: string;
  /** Number of dofs before fixing. */
  readonly dofs: number;
  /** Dofs removed from the model, 0-based, ascending. */
  readonly fixed: Int32Array;
  readonly matrices: ReadonlyMap<string, NamedMatrix>;
  readonly terms: readonly Term[];
  readonly constants: ReadonlyMap<string, number>;
  readonly design: readonly Variable[];
  readonly envelope: readonly OperatingParameter[];
  readonly perturbations: readonly Perturbation[];
  readonly margin: MarginSettings;
  readonly budget: readonly Limit[];
  readonly tune: TuneSettings;
  /** The problem file first, then matrix files in order of reading. */
  readonly inputs: readonly InputFile[];
}
