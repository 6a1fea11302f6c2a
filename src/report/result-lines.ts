/** Parts that the summaries of all commands share. */

import type {
  CommonResult,
  EffortResult,
  LimitResult,
  MarginCommandResult,
  MarginResult,
  UnperturbedResult,
} from "../tuning/result.js";
import { counted, noBreak, numberText, percentText, withUnit } from "./number-text.js";
import { pageWidth, wrap } from "./text-layout.js";

/** Label at the left and what stands beside it. */
export type LabelledText = readonly [label: string, text: string];

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

const measureNames: ReadonlyMap<string, (value: number | null) => string> = new Map([
  ["radius", (value) => `stability radius ${numberText(value)}`],
  ["multiplier", (value) => `critical multiplier ${numberText(value)}`],
  ["dampingRatio", (value) => `damping ratio ${percentText(value)}`],
]);

/** The measures beside the leading one, at the same operating point. */
export function measuresText({ measures }: MarginCommandResult): string {
  return Object.entries(measures)
    .map(([name, value]) => measureNames.get(name)?.(value) ?? `${name} ${numberText(value)}`)
    .join(", ");
}

/** Places that come next after the one that decides, three at most; empty where growth decides. */
export function competingText({ competing, margin }: MarginCommandResult): string {
  if (isGrowth(margin)) return "";
  return competing
    .slice(1, 4)
    .map(({ hz, value }) => `${numberText(value)} at ${withUnit(numberText(hz), "Hz")}`)
    .join(", ");
}

/** The value says how fast the model grows as it stands. */
export function isGrowth({ value, measure }: MarginResult): boolean {
  return value !== null && value < 0 && measure !== "multiplier";
}

export function stabilityText(unperturbed: UnperturbedResult): string {
  const { stable, unstable, unstableOutside, abscissa, onAxis } = unperturbed;
  const rate = abscissa === null ? "" : withUnit(numberText(Math.abs(abscissa), 3), "1/s");
  return [
    stable ? "stable as it stands" : `UNSTABLE as it stands: ${counted(unstable, "growing eigenvalue")}`,
    ...(abscissa === null ? [] : [`${abscissa > 0 ? "fastest growth" : "slowest decay"} ${rate}`]),
    ...(unstableOutside === 0 ? [] : [`${counted(unstableOutside, "growing eigenvalue")} outside the band`]),
    ...(onAxis === 0 ? [] : [`${counted(onAxis, "mode")} on the axis`]),
  ].join(", ");
}

/** The three least damped eigenvalues: "391.2 Hz (0.0397 %)". */
export function leastDampedText({ leastDamped }: UnperturbedResult): string {
  return leastDamped
    .slice(0, 3)
    .map(({ hz, ratio }) => `${withUnit(numberText(hz), "Hz")}${noBreak}(${percentText(ratio)})`)
    .join(", ");
}

/** "3.2 of 4 kg", and how far over where it is over. */
export function limitText({ used, limit, unit }: LimitResult): string {
  const over = used > limit * (1 + Math.sign(limit) * 1e-6) ? ", EXCEEDED" : "";
  return `${numberText(used)} of ${withUnit(numberText(limit), unit)}${over}`;
}

export function evidenceText(result: MarginCommandResult): string {
  const { status, witness, audit } = result;
  return [
    ...(status === "trusted" ? ["trusted"] : []),
    witness === null ? "no witness" : `witness residual ${numberText(witness.residual, 2)}`,
    audit.evaluations === 0
      ? "no audit yet"
      : `audit off by ${numberText(audit.worst, 2)} at worst in ${counted(audit.evaluations, "full-model evaluation")}`,
    ...envelopeText(result),
    ...(audit.levelSetClean ? [] : ["the level-set test found a peak that was missed"]),
  ].join(", ");
}

/** What the full model said at other operating points. */
function envelopeText({ audit: { envelope }, margin }: MarginCommandResult): string[] {
  if (envelope.length === 0) return [];
  const lowest = { ...margin, value: envelope[0].value };
  const said = isGrowth(lowest) ? "unstable too" : `at ${numberText(lowest.value)}`;
  return [`${counted(envelope.length, "other operating point")}, the lowest ${said}`];
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

export function modelText({ model: { dofs, modesCounted, searchedToHz } }: MarginCommandResult): string {
  return [
    counted(dofs, "dof"),
    ...(modesCounted === null ? [] : [`${counted(modesCounted, "mode")} counted`]),
    ...(searchedToHz === null ? [] : [`searched up to ${withUnit(numberText(searchedToHz), "Hz")}`]),
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
