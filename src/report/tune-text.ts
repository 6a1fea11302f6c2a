import type { JudgedDesign, TuneCommandResult } from "../tuning/result.js";
import { answerRows } from "./answer-rows.js";
import { balanceRows } from "./balance-rows.js";
import { counted, numberText, valueBeside, withUnit } from "./number-text.js";
import {
  cautionLines,
  competingText,
  effortText,
  evidenceText,
  headLines,
  isGrowth,
  type LabelledText,
  leastDampedText,
  measuresText,
  modelText,
  remarkRows,
  stabilityText,
} from "./result-lines.js";
import { clip, columnLines, labelledBlocks, page } from "./text-layout.js";

const nameWidth = 28;

/** The summary that `tune` prints: the answer, start and tuned design side by side, how sure it is, what it took. */
export function tuneText(result: TuneCommandResult): string {
  const { unperturbed, before } = result;
  const table = [
    ["", "before", "after"],
    ...comparedRows(before, result, result.units),
    ...designRows(before, result, result.units),
    ...budgetRows(before, result),
  ];
  const cause: LabelledText[] = [
    ["next", competingText(result)],
    ["also", measuresText(result)],
    ...balanceRows(result),
    ["stability", stabilityText(unperturbed)],
    ["least damped", leastDampedText(unperturbed)],
  ];
  const work: LabelledText[] = [
    ["starts", startsText(result)],
    ["rounds", roundsText(result)],
    ["steps", result.rounded ? "rounded to feasible purchasable steps and evaluated anew" : ""],
    ["model", modelText(result)],
    ["evidence", evidenceText(result)],
    ["effort", `${effortText(result.effort)}, seed ${result.seed}`],
    ...remarkRows(result),
  ];
  const [answer, ...rest] = labelledBlocks([answerRows(result), cause, work]);
  return page([headLines(result), answer, columnLines(table), ...rest, cautionLines(result)]);
}

function comparedRows(
  before: JudgedDesign,
  after: JudgedDesign,
  units: TuneCommandResult["units"],
): string[][] {
  const both = (label: string, cell: (side: JudgedDesign) => string, note = ""): string[] => [
    label,
    cell(before),
    cell(after),
    note,
  ];
  const points = Object.keys({ ...before.margin.at, ...after.margin.at });
  return [
    both("margin", ({ margin }) =>
      isGrowth(margin) ? "unstable" : valueBeside(margin.target, margin.value),
    ),
    both("growth", ({ unperturbed: { abscissa } }) => numberText(abscissa, 3), "1/s (below 0: dies out)"),
    both("breaks at", ({ margin: { breaksAtHz } }) => numberText(breaksAtHz), "Hz"),
    both("by", ({ margin: { loss } }) => loss ?? "none"),
    ...points.map((name) =>
      both(
        clip(name, nameWidth),
        ({ margin: { at } }) => numberText(at[name] ?? null),
        `${units[name] ?? ""} (worst)`.trimStart(),
      ),
    ),
  ];
}

function designRows(
  before: JudgedDesign,
  after: JudgedDesign,
  units: TuneCommandResult["units"],
): string[][] {
  return Object.keys(after.design).map((name) => [
    clip(name, nameWidth),
    numberText(before.design[name] ?? null),
    numberText(after.design[name]),
    units[name] ?? "",
  ]);
}

function budgetRows(before: JudgedDesign, after: JudgedDesign): string[][] {
  return Object.entries(after.budget).map(([name, { used, limit, unit }]) => {
    const first = before.budget[name];
    return [
      clip(name, nameWidth),
      first === undefined ? "none" : numberText(first.used),
      numberText(used),
      `of ${withUnit(numberText(limit), unit)}`,
    ];
  });
}

function startsText({ starts }: TuneCommandResult): string {
  if (starts.length === 0) return "";
  const values = starts.map(({ value }) => value);
  const [low, high] = [Math.min(...values), Math.max(...values)];
  return `${counted(starts.length, "ascent")} ended between ${numberText(low)} and ${numberText(high)} on the reduced model`;
}

function roundsText({ history }: TuneCommandResult): string {
  if (history.length === 0) return "";
  const values = history.map(({ full }) => numberText(full)).join(", ");
  return `${history.length}, confirmed on the full model: ${values}`;
}
