import type { Problem } from "../problem/problem.js";

/** Units of design variables and operating parameters by name, as results carry them. */
export function unitsOf({ design, envelope }: Problem): Record<string, string> {
  return Object.fromEntries([...design, ...envelope].map(({ name, unit }) => [name, unit]));
}
