/** The answer of a margin in words: value, what it means, where it breaks. */

import type { MarginCommandResult, MarginResult } from "../tuning/result.js";
import { assignments, noBreak, numberText, valueBeside, withUnit } from "./number-text.js";
import { isGrowth, type LabelledText } from "./result-lines.js";

/** Rows that come first in the summaries of `margin` and `tune`. */
export function answerRows(result: MarginCommandResult): LabelledText[] {
  const { margin, units } = result;
  const said = isGrowth(margin)
    ? growthText(result)
    : `${valueBeside(margin.target, margin.value)}, ${measureText(margin)}`;
  return [
    ["margin", [said, targetText(margin)].filter(Boolean).join(", ")],
    ["", meaningText(margin)],
    ["breaks at", breakText(margin, units)],
    ["between", betweenText(margin)],
  ];
}

function growthText({ unperturbed: { abscissa }, margin: { breaksAtHz } }: MarginCommandResult): string {
  const rate = abscissa === null ? "" : ` at ${withUnit(numberText(abscissa, 3), "1/s")}`;
  const place = breaksAtHz === null ? "" : ` near ${withUnit(numberText(breaksAtHz), "Hz")}`;
  return `UNSTABLE: grows${rate}${place} as it stands`;
}

const decayNames: ReadonlyMap<string, string> = new Map([
  ["rate", "decay rate [1/s]"],
  ["ratio", "damping ratio"],
  ["logDecrement", "logarithmic decrement"],
]);

/** What the value is: "complex stability radius", "critical multiplier", "damping ratio". */
function measureText({ measure, kind, lowerBound }: MarginResult): string {
  const bound = lowerBound ? " (a lower bound)" : "";
  if (measure === "multiplier") return `critical multiplier${bound}`;
  if (measure === "decay") return `${decayNames.get(kind ?? "") ?? "decay"}${bound}`;
  return `${kind ?? ""} stability radius${bound}`.trimStart();
}

/** What the value means for the machine, in one line. */
function meaningText(margin: MarginResult): string {
  const { value, measure, kind } = margin;
  if (value === null) return "";
  if (isGrowth(margin)) {
    return measure === "decay"
      ? `${decayNames.get(kind ?? "") ?? "decay"} ${numberText(value)}`
      : `(value ${numberText(value)}: growth by highest frequency, no distance)`;
  }
  if (measure === "radius")
    return `withstands model errors up to ${numberText(value)} times the declared one`;
  if (measure === "multiplier") {
    return `stable ${value < 1 ? "only " : ""}up to ${numberText(value)} times the terms it scales`;
  }
  return "";
}

/** "target 1 reached" or "target 1 MISSED"; empty without a target. */
export function targetText({ target, meetsTarget }: MarginResult): string {
  if (target === null || meetsTarget === null) return "";
  return `target${noBreak}${numberText(target)}${noBreak}${meetsTarget ? "reached" : "MISSED"}`;
}

/** Where it breaks: "391.2 Hz by flutter, at friction = 0.55". */
function breakText(
  { loss, breaksAtHz, at, value }: MarginResult,
  units: MarginCommandResult["units"],
): string {
  const place = [
    ...(breaksAtHz === null ? [] : [withUnit(numberText(breaksAtHz), "Hz")]),
    ...(loss === null ? [] : [`by ${loss}`]),
  ].join(" ");
  const known = place === "" && value === null ? "nowhere that was searched" : place;
  const point = assignments(at, units);
  return [known, ...(point === "" ? [] : [`at ${point}`])].filter((text) => text !== "").join(", ");
}

/** "0.834 and 0.8341", null ends open; empty where it would say nothing. */
function betweenText(margin: MarginResult): string {
  const {
    between: [low, high],
    value,
  } = margin;
  if (isGrowth(margin) || (value === null && low === null && high === null)) return "";
  const digits = 6;
  return `${low === null ? "unknown" : numberText(low, digits)} and ${high === null ? "no limit" : numberText(high, digits)}`;
}
