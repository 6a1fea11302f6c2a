import type { PencilIndex } from "../model/pencil-index.js";
import type { Verdict } from "../model/structure-check.js";
import type { TermGroup } from "../problem/problem.js";
import type { CommonResult } from "./result.js";

export interface TermRow {
  readonly name: string;
  readonly group: TermGroup;
  readonly matrix: string;
  /** Entries of the matrix on the free dofs. */
  readonly nonzeros: number;
  /** φ at the start design and nominal operating point. */
  readonly factor: number;
  /** max |A − Aᵀ| / max |A|; of a gyroscopic matrix max |A + Aᵀ| / max |A|. */
  readonly asymmetry: number;
}

/** The worst verdict on one matrix over all points checked. */
export interface DefinitenessRow {
  readonly verdict: Verdict;
  /** Most negative eigenvalues met. */
  readonly negative: number;
  /** Design and operating values of the worst point; null where all points agree. */
  readonly at: Readonly<Record<string, number>> | null;
  /** Zero eigenvalues at the nominal point. */
  readonly rankDeficiency: number;
  /** The inertia is a proof at every point. */
  readonly proved: boolean;
}

export interface CheckResult extends CommonResult {
  readonly command: "check";
  readonly sizes: {
    readonly dofs: number;
    readonly fixed: number;
    readonly free: number;
    /** Of the pattern that all matrices share, diagonal and mirrored entries included. */
    readonly nonzeros: number;
  };
  readonly terms: readonly TermRow[];
  readonly definiteness: {
    readonly mass: DefinitenessRow;
    readonly damping: DefinitenessRow;
    readonly stiffness: DefinitenessRow;
    /** Points of design box × envelope at which the three were checked. */
    readonly points: number;
    /** All corners of the parameters in M, D and K are among them. */
    readonly allCorners: boolean;
  };
  readonly structure: {
    /** Dofs without any entry in M. */
    readonly masslessDofs: number;
    readonly massRankDeficiency: number;
    readonly index: PencilIndex;
    /** det P(s) does not vanish identically, at every point checked. */
    readonly regular: boolean;
    /** Points at which that was checked. */
    readonly regularityPoints: number;
    /** Design and operating values of the first point where it does vanish, */
    readonly singularAt: Readonly<Record<string, number>> | null;
    /** and dofs (counted from 1) whose motion nothing determines. */
    readonly undeterminedDofs: readonly number[];
  };
  readonly stability: {
    /** Circulatory or frictional terms with a factor other than 0 at some point. */
    readonly feedingTerms: boolean;
    /** M, D, K ≥ 0 at every point: without the feeding terms no eigenvalue lies right of the axis. */
    readonly stableByStructure: boolean;
    /** Modes that no damping reaches, at the nominal point; gyroscopic coupling ignored. */
    readonly undamped: {
      /** null when not determined. */
      readonly count: number | null;
      /** The lowest of them, at most twenty. */
      readonly frequenciesHz: readonly number[];
      readonly searchedToHz: number | null;
      /** Why the count is null. */
      readonly reason: string | null;
    };
  };
}
