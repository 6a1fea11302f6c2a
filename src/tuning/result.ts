/**
 * The result object that every command leaves behind, prints with `--json`, and that scripts rely on.
 * Infinite or absent values are null. Frequencies in Hz, everything else SI.
 */

export type ResultStatus =
  | "trusted"
  | "bracket-open"
  | "untrusted"
  | "unsound"
  | "infeasible"
  | "interrupted";

export interface MarginResult {
  /** null: there is no limit to be found. */
  readonly value: number | null;
  readonly between: readonly [number | null, number | null];
  readonly measure: "radius" | "multiplier" | "decay";
  /** Radius: kind of the declared error; decay: rate, ratio or logDecrement; null for the multiplier. */
  readonly kind: string | null;
  /** The declared error has structure that the value does not use, so it is a lower bound of the true margin. */
  readonly lowerBound: boolean;
  readonly loss: "flutter" | "divergence" | null;
  readonly breaksAtHz: number | null;
  readonly at: Readonly<Record<string, number>>;
  readonly target: number | null;
  /** null without a target. */
  readonly meetsTarget: boolean | null;
}

export interface EigenvalueRow {
  readonly hz: number;
  readonly ratio: number;
}

export interface UnperturbedResult {
  readonly stable: boolean;
  readonly unstable: number;
  readonly unstableOutside: number;
  /** Largest real part in the band [1/s]. */
  readonly abscissa: number | null;
  /** Modes on the axis within rounding: no damping reaches them. */
  readonly onAxis: number;
  /** Least damped eigenvalues in the band. */
  readonly leastDamped: readonly EigenvalueRow[];
  /** Nearly unstable eigenvalues that the full model confirmed or refuted. */
  readonly examined: number;
}

export interface LimitResult {
  readonly used: number;
  readonly limit: number;
  readonly unit: string;
}

export interface JudgedDesign {
  readonly margin: MarginResult;
  readonly design: Readonly<Record<string, number>>;
  readonly budget: Readonly<Record<string, LimitResult>>;
  readonly unperturbed: UnperturbedResult;
}

export interface CompetingPeak {
  readonly hz: number;
  readonly value: number;
}

export interface ConvergenceRow {
  readonly hz: number;
  /** What the reduced model said at this place, and what the full one did. */
  readonly reduced: number;
  readonly full: number;
  readonly reducedOrder: number;
}

export interface BalanceRow {
  readonly name: string;
  readonly group: string;
  /** Share of the power dissipated (positive) or fed in (negative); rows of one table add to zero. */
  readonly power: number;
}

export interface EffortResult {
  readonly factorisations: number;
  readonly complexFactorisations: number;
  readonly realFactorisations: number;
  /** Of `tune`: before the final judgement, which is the audit. */
  readonly factorisationsBeforeAudit: number | null;
  readonly reducedOrder: number;
  readonly reducedEvaluations: number;
  readonly seconds: number;
}

export interface CommonResult {
  readonly format: "dampwright-result/1";
  readonly command: "check" | "margin" | "tune";
  readonly version: string;
  readonly title: string;
  /** Units of design variables and operating parameters by name; "" where the problem gives none. */
  readonly units: Readonly<Record<string, string>>;
  readonly status: ResultStatus;
  /** Why the numbers are not to be trusted. */
  readonly doubts: readonly string[];
  readonly warnings: readonly string[];
  readonly cautions: readonly string[];
  readonly model: {
    readonly dofs: number;
    readonly modesCounted: number | null;
    readonly searchedToHz: number | null;
  };
  readonly effort: EffortResult;
  readonly inputs: readonly { readonly path: string; readonly sha256: string; readonly bytes: number }[];
}

export interface MarginCommandResult extends CommonResult, JudgedDesign {
  readonly command: "margin" | "tune";
  /** Other measures at the same operating point; null where one does not apply or has no limit. */
  readonly measures: Readonly<Record<string, number | null>>;
  readonly competing: readonly CompetingPeak[];
  readonly witness: { readonly residual: number; readonly size: number | null } | null;
  readonly audit: {
    readonly worst: number;
    readonly evaluations: number;
    readonly frequenciesHz: readonly number[];
    /** Full-model margins at other operating points. */
    readonly envelope: readonly {
      readonly at: Readonly<Record<string, number>>;
      readonly value: number | null;
    }[];
    readonly levelSetClean: boolean;
  };
  readonly balance: readonly BalanceRow[];
  readonly convergence: readonly ConvergenceRow[];
}

export interface RoundRow {
  readonly round: number;
  readonly design: Readonly<Record<string, number>>;
  readonly at: Readonly<Record<string, number>>;
  readonly reduced: number;
  readonly full: number;
  readonly factorisations: number;
  readonly reducedOrder: number;
}

export interface TuneCommandResult extends MarginCommandResult {
  readonly command: "tune";
  readonly seed: number;
  readonly before: JudgedDesign;
  readonly history: readonly RoundRow[];
  /** Local optima the starts led to, reduced model, best first: their spread tells how flat or rugged the problem is. */
  readonly starts: readonly { readonly value: number; readonly design: Readonly<Record<string, number>> }[];
  /** Stepped variables were rounded to a feasible neighbour and evaluated anew. */
  readonly rounded: boolean;
}

/** Said in every result and report. */
export const cautions: readonly string[] = [
  "A computed margin is no release: it covers the declared model error and nothing else.",
  "Follow the codes that apply where the machine runs, test it, and have a qualified engineer decide.",
];
