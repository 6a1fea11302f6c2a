/** The power balance of the worst vector: what feeds the vibration and what damps it. */

import type { BalanceRow, MarginCommandResult } from "../tuning/result.js";
import { noBreak, numberText, withUnit } from "./number-text.js";
import type { LabelledText } from "./result-lines.js";

/** Shares below this are named together. */
const smallest = 0.01;
const most = 5;

export function balanceRows({ balance }: MarginCommandResult): LabelledText[] {
  const stored = balance.find(({ group }) => group === "growth")?.power ?? 0;
  const rest = balance.filter(({ group }) => group !== "growth");
  const growth = stored > 0 ? [`${shareText(stored)} are left and make it grow`] : [];
  const dying = stored < 0 ? [`its own energy as it dies out ${shareText(-stored)}`] : [];
  return [
    ["fed by", [...dying, ...shares(rest.filter(({ power }) => power < 0))].join(", ")],
    ["damped by", [...shares(rest.filter(({ power }) => power > 0)), ...growth].join(", ")],
  ];
}

/** "rub 87 %", the largest first, the small ones together at the end. */
function shares(rows: readonly BalanceRow[]): string[] {
  const ranked = rows
    .map(({ name, power }) => ({ name, power: Math.abs(power) }))
    .sort((a, b) => b.power - a.power);
  const named = ranked.slice(0, most).filter(({ power }) => power >= smallest);
  const others = ranked.slice(named.length).reduce((sum, { power }) => sum + power, 0);
  return [
    ...named.map(({ name, power }) => `${name.replaceAll(" ", noBreak)}${noBreak}${shareText(power)}`),
    ...(others >= 0.001 ? [`others${noBreak}${shareText(others)}`] : []),
  ];
}

function shareText(share: number): string {
  return withUnit(numberText(100 * share, share >= 0.1 ? 2 : 1), "%");
}
