import type { CheckResult, DefinitenessRow } from "../tuning/check-problem.js";
import { assignments, counted, numberText, withUnit } from "./number-text.js";
import { cautionLines, effortText, headLines, type LabelledText, remarkRows } from "./result-lines.js";
import { clip, columnLines, labelledLines, page } from "./text-layout.js";

const nameWidth = 32;

/** The summary that `check` prints: sound or not and why, the matrices, the structure, the terms. */
export function checkText(result: CheckResult): string {
  const { definiteness, doubts, warnings, effort, units } = result;
  const sound = result.status === "trusted" ? "sound" : result.status;
  const rows: LabelledText[] = [
    ["model", `${sound}${doubts.length === 0 ? "" : `, ${counted(doubts.length, "fault")}`}`],
    ...remarkRows({ doubts, warnings }),
    ["stability", stabilityText(result)],
    ["undamped", undampedText(result)],
    ["size", sizeText(result)],
    ["mass", definitenessText(definiteness.mass, units)],
    ["damping", definitenessText(definiteness.damping, units)],
    ["stiffness", definitenessText(definiteness.stiffness, units)],
    [
      "checked at",
      `${counted(definiteness.points, "point")}${definiteness.allCorners ? ", all corners among them" : ""}`,
    ],
    ["structure", structureText(result)],
    ["effort", effortText(effort)],
  ];
  return page([headLines(result), labelledLines(rows), columnLines(termTable(result)), cautionLines(result)]);
}

function stabilityText({ stability: { feedingTerms, stableByStructure } }: CheckResult): string {
  if (!stableByStructure) return "structure guarantees nothing";
  return feedingTerms
    ? "stable by structure without its feeding terms, which can change that"
    : "stable by structure: nothing feeds energy in";
}

function undampedText({ stability }: CheckResult): string {
  const { count, frequenciesHz, searchedToHz, reason } = stability.undamped;
  const reach = searchedToHz === null ? "" : ` up to ${withUnit(numberText(searchedToHz), "Hz")}`;
  if (count === null) return `not determined${reason === null ? "" : `: ${reason}`}`;
  if (count === 0) return `damping reaches every mode${reach}`;
  const listed = frequenciesHz.slice(0, 4).map((hz) => numberText(hz));
  return `${counted(count, "mode")}${reach} that no damping reaches: ${listed.join(", ")}${count > 4 ? ", …" : ""} Hz`;
}

function sizeText({ sizes: { dofs, fixed, free, nonzeros } }: CheckResult): string {
  return `${counted(dofs, "dof")}, ${fixed} fixed, ${free} free, ${counted(nonzeros, "place")} in the merged pattern`;
}

function definitenessText(
  { verdict, negative, at, proved }: DefinitenessRow,
  units: CheckResult["units"],
): string {
  return [
    verdict === "indefinite" ? `INDEFINITE, ${counted(negative, "negative eigenvalue")}` : verdict,
    ...(at === null || Object.keys(at).length === 0 ? [] : [`worst at ${assignments(at, units)}`]),
    ...(proved ? [] : ["not proved everywhere"]),
  ].join(", ");
}

function structureText({ structure }: CheckResult): string {
  const { masslessDofs, massRankDeficiency, index, regular } = structure;
  return [
    regular ? "regular pencil" : "SINGULAR pencil",
    `index ${index}`,
    counted(masslessDofs, "massless dof"),
    `mass matrix ${massRankDeficiency === 0 ? "of full rank" : `short of full rank by ${massRankDeficiency}`}`,
  ].join(", ");
}

function termTable({ terms }: CheckResult): string[][] {
  return [
    ["term", "group", "entries", "factor", "asymmetry"],
    ...terms.map(({ name, group, nonzeros, factor, asymmetry }) => [
      clip(name, nameWidth),
      group,
      String(nonzeros),
      numberText(factor),
      numberText(asymmetry, 2),
    ]),
  ];
}
