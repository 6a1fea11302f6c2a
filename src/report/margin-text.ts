import type { MarginCommandResult } from "../tuning/result.js";
import { counted, numberText, withUnit } from "./number-text.js";
import {
  betweenText,
  breakText,
  cautionLines,
  effortText,
  evidenceText,
  headLines,
  type LabelledText,
  leastDampedText,
  limitText,
  marginValue,
  measuresText,
  measureText,
  remarkRows,
  stabilityText,
  targetText,
  type Units,
} from "./result-lines.js";
import { labelledLines, page } from "./text-layout.js";

/** The summary that `margin` prints: the answer, what the machine does without model error, the evidence. */
export function marginText(result: MarginCommandResult, units: Units): string {
  const { margin, unperturbed, budget, model } = result;
  const growth = margin.measure === "radius" && margin.value !== null && margin.value < 0;
  const answer: LabelledText[] = [
    ["margin", [marginValue(margin), measureText(margin), targetText(margin)].filter(Boolean).join(", ")],
    ["", growth ? "below zero: how fast it grows as it stands, not a distance" : ""],
    ["breaks at", breakText(margin, units)],
    ["between", betweenText(margin)],
    ["also", measuresText(result)],
  ];
  const state: LabelledText[] = [
    ["stability", stabilityText(unperturbed)],
    ["least damped", leastDampedText(unperturbed)],
    ...Object.entries(budget).map(([name, limit]): LabelledText => [name, limitText(limit)]),
  ];
  const work: LabelledText[] = [
    ["model", `${counted(model.dofs, "dof")}${searchedText(result)}`],
    ["evidence", evidenceText(result)],
    ["effort", effortText(result.effort)],
    ...remarkRows(result),
  ];
  return page([headLines(result), labelledLines([...answer, ...state, ...work]), cautionLines(result)]);
}

function searchedText({ model: { modesCounted, searchedToHz } }: MarginCommandResult): string {
  const modes = modesCounted === null ? "" : `, ${counted(modesCounted, "mode")} counted`;
  return searchedToHz === null
    ? modes
    : `${modes}, searched up to ${withUnit(numberText(searchedToHz), "Hz")}`;
}
