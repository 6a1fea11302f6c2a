import type { Shape } from "./models.js";
import type { Outcome, Row } from "./row.js";
import { aligned } from "./table.js";

/** Our solver with its best kernel and the native ones on one model. */
export interface Comparison {
  readonly model: string;
  readonly shape: Shape;
  readonly ours: Outcome;
  readonly superlu: Outcome;
  readonly umfpack: Outcome;
}

/** Our time over the peer's, at most; null where none is set. */
interface Goals {
  readonly superlu: number;
  readonly umfpack: number | null;
}

const factorGoals: Readonly<Record<Shape, Goals>> = {
  plate: { superlu: 1 / 1.4, umfpack: 1.5 },
  slab: { superlu: 1 / 2, umfpack: 2 },
  cube: { superlu: 1 / 2, umfpack: null },
};

/** Per right-hand side against the quickest peer, hence against each. */
const SOLVE_GOAL = 1.5;

const headings = [
  "",
  "factor ÷ SuperLU",
  "factor ÷ UMFPACK",
  "block solve ÷ SuperLU",
  "block solve ÷ UMFPACK",
];

/** A line a model: ratios of times, and whether each keeps its goal. */
export function goalSummary(comparisons: readonly Comparison[]): string {
  const factor = (row: Row): number => Math.min(...row.factorS);
  const solve = (row: Row): number => row.solveBlockS;
  const lines = comparisons.map(({ model, shape, ours, superlu, umfpack }) => [
    model,
    verdict(ours, superlu, factor, factorGoals[shape].superlu),
    verdict(ours, umfpack, factor, factorGoals[shape].umfpack),
    verdict(ours, superlu, solve, SOLVE_GOAL),
    verdict(ours, umfpack, solve, SOLVE_GOAL),
  ]);
  return aligned([headings, ...lines]);
}

function verdict(ours: Outcome, peer: Outcome, time: (row: Row) => number, goal: number | null): string {
  if ("absent" in ours || "absent" in peer) return "not measured";
  const ratio = time(ours) / time(peer);
  if (goal === null) return `${ratio.toFixed(2)}  no goal`;
  return `${ratio.toFixed(2)}  ${ratio <= goal ? "met" : "MISSED"}, ≤ ${goal.toFixed(2)}`;
}
