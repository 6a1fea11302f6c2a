import { expect } from "vitest";
import { computeMargin } from "../../src/tuning/commands.js";
import { bruteSweep, type SweepOptions } from "./brute-sweep.js";
import { ringBrakeProblem } from "./ring-brake-problem.js";

/** Margin at one operating point against a brute sweep of the full model there. */
export async function compareWithSweep(
  dofs: number,
  design: ReadonlyMap<string, number>,
  at: ReadonlyMap<string, number>,
  options: SweepOptions,
): Promise<void> {
  const problem = await ringBrakeProblem(dofs);
  const { result } = await computeMargin(
    problem,
    { design, at },
    { version: "test", progress: () => {}, snapshot: () => {} },
  );
  const { margin, design: used, unperturbed } = result;
  const values = new Map([...problem.constants, ...Object.entries(used), ...Object.entries(margin.at)]);
  const sweep = bruteSweep(problem, values, options);
  console.log(
    `${result.model.dofs} dofs: greedy 1/r = ${1 / margin.value!} at ${margin.breaksAtHz} Hz with ${result.effort.factorisations} factorisations; sweep ${sweep.sigma} at ${sweep.omega / (2 * Math.PI)} Hz with ${sweep.solves}, ${sweep.eigenvalues} eigenvalues polished`,
  );
  expect(sweep.abscissa).toBeLessThan(0);
  expect(unperturbed.stable).toBe(true);
  // The loop's peak must not lie below the sweep's by more than its tolerance (1e-9) and the audit's slack.
  expect(1 / margin.value!).toBeGreaterThan(sweep.sigma * (1 - 1e-8));
  // The sweep's own polish stops at a share of 1e-4 of a half-power width: 1e-7 of the height.
  expect(1 / margin.value!).toBeLessThan(sweep.sigma * (1 + 1e-6));
  expect(Math.abs((2 * Math.PI * margin.breaksAtHz!) / sweep.omega - 1)).toBeLessThan(1e-5);
}

/** Where the tuned design and the start design are worst, nearly. */
export const highFriction: ReadonlyMap<string, number> = new Map([
  ["friction", 0.55],
  ["pressure", 0.5],
]);
export const lowFriction: ReadonlyMap<string, number> = new Map([
  ["friction", 0.25],
  ["pressure", 1],
]);
