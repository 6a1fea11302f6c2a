import type { MarginCommandResult } from "../tuning/result.js";
import { answerRows } from "./answer-rows.js";
import { balanceRows } from "./balance-rows.js";
import {
  cautionLines,
  competingText,
  effortText,
  evidenceText,
  headLines,
  type LabelledText,
  leastDampedText,
  limitText,
  measuresText,
  modelText,
  remarkRows,
  stabilityText,
} from "./result-lines.js";
import { labelledBlocks, page } from "./text-layout.js";

/** The summary that `margin` prints: the answer, what the machine does without model error, the evidence. */
export function marginText(result: MarginCommandResult): string {
  const { unperturbed, budget } = result;
  const limits = Object.entries(budget).map(([name, limit]): LabelledText => [name, limitText(limit)]);
  const answer: LabelledText[] = [
    ...answerRows(result),
    ["next", competingText(result)],
    ["also", measuresText(result)],
  ];
  const cause: LabelledText[] = [
    ...balanceRows(result),
    ["stability", stabilityText(unperturbed)],
    ["least damped", leastDampedText(unperturbed)],
  ];
  const work: LabelledText[] = [
    ["model", modelText(result)],
    ["evidence", evidenceText(result)],
    ["effort", effortText(result.effort)],
    ...remarkRows(result),
  ];
  return page([headLines(result), ...labelledBlocks([answer, cause, limits, work]), cautionLines(result)]);
}
