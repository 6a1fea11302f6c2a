/** Parts that the summaries of all commands share. */

import type {
  CommonResult,
  EffortResult,
  LimitResult,
  MarginCommandResult,
  MarginResult,
  UnperturbedResult,
} from "../tuning/result.js";
import { assignments, counted, noBreak, numberText, valueBeside, withUnit } from "./number-text.js";
import { pageWidth, wrap } from "./text-layout.js";

/** Label at the left and what stands beside it. */
export type LabelledText = readonly [label: string, text: string];

/** Units of design variables and operating parameters by name. */
export type Units = ReadonlyMap<string, string>;

const statusText: Readonly<Record<CommonResult["status"], string>> = {
  trusted: "",
  "bracket-open": "OPEN: the margin lies somewhere in a wide bracket",
  untrusted: "NOT TO BE TRUSTED: the evidence does not hold",
  unsound: "UNSOUND MODEL",
  infeasible: "INFEASIBLE: no design keeps all limits",
  interrupted: "INTERRUPTED: the best so far",
};

/** Title and, unless all is well, the status. */
export function headLines({ title, status }: Pick<CommonResult, "title" | "status">): string[] {
  const said = statusText[status];
  return [...wrap(title, pageWidth), ...(said === "" ? [] : [said])];
}

const decayNames: ReadonlyMap<string, string> = new Map([
  ["rate", "decay rate [1/s]"],
  ["ratio", "damping ratio"],
  ["logDecrement", "logarithmic decrement"],
]);

/** What the value is: "complex stability radius", "critical multiplier", "damping ratio". */
export function measureText({ measure, kind, lowerBound }: MarginResult): string {
  const bound = lowerBound ? " (a lower bound)" : "";
  if (measure === "multiplier") return `critical multiplier${bound}`;
  if (measure === "decay") return `${decayNames.get(kind ?? "") ?? "decay"}${bound}`;
  return `${kind ?? ""} stability radius${bound}`.trimStart();
}

const measureNames: ReadonlyMap<string, string> = new Map([
  ["radius", "stability radius"],
  ["multiplier", "critical multiplier"],
  ["dampingRatio", "damping ratio"],
]);

/** The measures beside the leading one. */
export function measuresText({ measures }: MarginCommandResult): string {
  return Object.entries(measures)
    .map(([name, value]) => `${measureNames.get(name) ?? name} ${numberText(value)}`)
    .join(", ");
}

/** "target 1 reached" or "target 1 missed"; empty without a target. */
export function targetText({ target, meetsTarget }: MarginResult): string {
  if (target === null || meetsTarget === null) return "";
  return `target ${numberText(target)} ${meetsTarget ? "reached" : "MISSED"}`;
}

export function marginValue({ value, target }: MarginResult): string {
  return valueBeside(target, value);
}

/** Where it breaks: "flutter at 391.2 Hz, friction = 0.55". */
export function breakText({ loss, breaksAtHz, at, value }: MarginResult, units: Units): string {
  const place = [
    ...(breaksAtHz === null ? [] : [withUnit(numberText(breaksAtHz), "Hz")]),
    ...(loss === null ? [] : [`by ${loss}`]),
  ].join(" ");
  const known = place === "" && value === null ? "nowhere that was searched" : place;
  const point = assignments(at, units);
  return [known, ...(point === "" ? [] : [`at ${point}`])].filter((text) => text !== "").join(", ");
}

/** "0.834 and 0.8341", null ends open. */
export function betweenText({ between: [low, high], value }: MarginResult): string {
  if (value === null && low === null && high === null) return "";
  const digits = 6;
  return `${low === null ? "unknown" : numberText(low, digits)} and ${high === null ? "no limit" : numberText(high, digits)}`;
}

export function stabilityText(unperturbed: UnperturbedResult): string {
  const { stable, unstable, unstableOutside, abscissa, onAxis } = unperturbed;
  return [
    stable ? "stable as it stands" : `UNSTABLE as it stands: ${counted(unstable, "growing eigenvalue")}`,
    ...(abscissa === null ? [] : [`largest real part ${withUnit(numberText(abscissa, 3), "1/s")}`]),
    ...(unstableOutside === 0 ? [] : [`${counted(unstableOutside, "growing eigenvalue")} outside the band`]),
    ...(onAxis === 0 ? [] : [`${counted(onAxis, "mode")} on the axis`]),
  ].join(", ");
}

/** The three least damped eigenvalues. */
export function leastDampedText({ leastDamped }: UnperturbedResult): string {
  return leastDamped
    .slice(0, 3)
    .map(({ hz, ratio }) => `${withUnit(numberText(hz), "Hz")} (ratio${noBreak}${numberText(ratio, 3)})`)
    .join(", ");
}

/** "3.2 of 4 kg", and how far over where it is over. */
export function limitText({ used, limit, unit }: LimitResult): string {
  const over = used > limit * (1 + Math.sign(limit) * 1e-6) ? ", EXCEEDED" : "";
  return `${numberText(used)} of ${withUnit(numberText(limit), unit)}${over}`;
}

export function evidenceText({ witness, audit }: MarginCommandResult): string {
  return [
    witness === null ? "no witness" : `witness residual ${numberText(witness.residual, 2)}`,
    `audit off by ${numberText(audit.worst, 2)} at worst in ${counted(audit.evaluations, "full-model evaluation")}`,
    ...(audit.levelSetClean ? [] : ["the level-set test found a peak that was missed"]),
  ].join(", ");
}

export function effortText(effort: EffortResult): string {
  const { factorisations, factorisationsBeforeAudit, reducedOrder, reducedEvaluations, seconds } = effort;
  const audited =
    factorisationsBeforeAudit === null ? "" : ` (${factorisationsBeforeAudit} before the audit)`;
  return [
    `${counted(factorisations, "factorisation")}${audited}`,
    ...(reducedOrder === 0 ? [] : [`reduced order ${reducedOrder}`]),
    ...(reducedEvaluations === 0 ? [] : [`${counted(reducedEvaluations, "reduced evaluation")}`]),
    withUnit(numberText(seconds, 3), "s"),
  ].join(", ");
}

/** Reasons for distrust and warnings, one a row. */
export function remarkRows({ doubts, warnings }: Pick<CommonResult, "doubts" | "warnings">): LabelledText[] {
  return [
    ...doubts.map((doubt): LabelledText => ["doubt", doubt]),
    ...warnings.map((warning): LabelledText => ["warning", warning]),
  ];
}

export function cautionLines({ cautions }: Pick<CommonResult, "cautions">): string[] {
  return cautions.flatMap((caution) => wrap(caution, pageWidth));
}
