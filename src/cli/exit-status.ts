import type { MarginResult, ResultStatus } from "../tuning/result.js";

/** Of a result, what decides how the process ends. */
export interface Answer {
  readonly status: ResultStatus;
  readonly margin?: MarginResult;
}

/**
 * Exit status of a result: 0 answered; 1 target missed (without a target: value below 0, multiplier below 1),
 * infeasible or unsound; 3 not to be trusted; 130 interrupted. "Nothing to be found" (null) meets every target.
 */
export function exitStatus({ status, margin }: Answer): number {
  switch (status) {
    case "interrupted":
      return 130;
    case "untrusted":
    case "bracket-open":
      return 3;
    case "unsound":
    case "infeasible":
      return 1;
    case "trusted":
      return margin === undefined || isMet(margin) ? 0 : 1;
  }
}

function isMet({ value, target, meetsTarget, measure }: MarginResult): boolean {
  if (value === null && measure !== "decay") return true;
  if (target !== null) return meetsTarget === true;
  return value === null || value >= (measure === "multiplier" ? 1 : 0);
}
