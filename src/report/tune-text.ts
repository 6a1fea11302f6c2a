import type { JudgedDesign, TuneCommandResult } from "../tuning/result.js";
import { counted, numberText, withUnit } from "./number-text.js";
import {
  betweenText,
  cautionLines,
  effortText,
  evidenceText,
  headLines,
  type LabelledText,
  leastDampedText,
  marginValue,
  measuresText,
  measureText,
  remarkRows,
  stabilityText,
  targetText,
  type Units,
} from "./result-lines.js";
import { clip, columnLines, labelledLines, page } from "./text-layout.js";

const nameWidth = 28;

/** The summary that `tune` prints: the start and the tuned design side by side, how sure it is, what it took. */
export function tuneText(result: TuneCommandResult, units: Units): string {
  const { margin, unperturbed } = result;
  const table = [
    ["", "before", "after", targetText(margin)],
    ...answerRows(result.before, result, units),
    ...designRows(result.before, result, units),
    ...budgetRows(result.before, result),
  ];
  const rows: LabelledText[] = [
    ["margin", measureText(margin)],
    ["between", betweenText(margin)],
    ["also", measuresText(result)],
    ["stability", stabilityText(unperturbed)],
    ["least damped", leastDampedText(unperturbed)],
    ["starts", startsText(result)],
    ["rounds", roundsText(result)],
    ["steps", result.rounded ? "rounded to feasible purchasable steps and evaluated anew" : ""],
    ["model", counted(result.model.dofs, "dof")],
    ["evidence", evidenceText(result)],
    ["effort", `${effortText(result.effort)}, seed ${result.seed}`],
    ...remarkRows(result),
  ];
  return page([headLines(result), columnLines(table), labelledLines(rows), cautionLines(result)]);
}

function answerRows(before: JudgedDesign, after: JudgedDesign, units: Units): string[][] {
  const both = (label: string, cell: (side: JudgedDesign) => string, note = ""): string[] => [
    label,
    cell(before),
    cell(after),
    note,
  ];
  const points = Object.keys({ ...before.margin.at, ...after.margin.at });
  return [
    both("margin", ({ margin }) => marginValue(margin)),
    both("breaks at", ({ margin: { breaksAtHz } }) => numberText(breaksAtHz), "Hz"),
    both("by", ({ margin: { loss } }) => loss ?? "none"),
    ...points.map((name) =>
      both(
        clip(name, nameWidth),
        ({ margin: { at } }) => numberText(at[name] ?? null),
        worstNote(units.get(name)),
      ),
    ),
    both("unstable", ({ unperturbed: { unstable } }) => String(unstable), "eigenvalues"),
  ];
}

function worstNote(unit: string | undefined): string {
  return withUnit("", unit).trim() === "" ? "(worst)" : `${unit} (worst)`;
}

function designRows(before: JudgedDesign, after: JudgedDesign, units: Units): string[][] {
  return Object.keys(after.design).map((name) => [
    clip(name, nameWidth),
    numberText(before.design[name] ?? null),
    numberText(after.design[name]),
    units.get(name) ?? "",
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
  return `${starts.length} led to ${numberText(low)} up to ${numberText(high)} on the reduced model`;
}

function roundsText({ history }: TuneCommandResult): string {
  if (history.length === 0) return "";
  const values = history.map(({ full }) => numberText(full)).join(", ");
  return `${history.length}, full model: ${values}`;
}
