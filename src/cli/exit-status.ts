import type { MarginResult, ResultStatus } from "../tuning/result.js";

/** Of a result, what decides how the process ends. */
export interface Answer {
  readonly status: ResultStatus;
  readonly margin?: MarginResult;
}

/**
 * Exit status of a result: 0 answered; 1 target missed (without a target: value below 0, multiplier below 1),
 * infeasible or unsound; 3 not to be trusted, or the target inside an open bracket; 130 interrupted. "Nothing to be
 * found" (null) meets every target.
 */
export function exitStatus({ status, margin }: Answer): number {
  switch (status) {
    case "interrupted":
      return 130;
    case "untrusted":
      return 3;
    case "bracket-open":
      return margin === undefined ? 3 : openStatus(margin);
    case "unsound":
    case "infeasible":
      return 1;
    case "trusted":
      return margin === undefined || isMet(margin) ? 0 : 1;
  }
}

function isMet(margin: MarginResult): boolean {
  const { value, target, meetsTarget, measure } = margin;
  if (value === null && measure !== "decay") return true;
  if (target !== null) return meetsTarget === true;
  return value === null || value >= wanted(margin);
}

/** A bracket that is open answers all the same when all of it meets the target, or all of it misses. */
function openStatus(margin: MarginResult): number {
  const [low, high] = margin.between;
  if (low !== null && low >= wanted(margin)) return 0;
  return high !== null && high < wanted(margin) ? 1 : 3;
}

function wanted({ target, measure }: MarginResult): number {
  return target ?? (measure === "multiplier" ? 1 : 0);
}
