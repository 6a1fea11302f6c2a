import { it } from "vitest";
import { compareWithSweep, highFriction } from "./brute-sweep-case.js";
import { stableDesign } from "./ring-brake-problem.js";

/** About two thousand complex factorisations of 10 000 dofs: an hour. */
it("on the ring brake of 10 000 dofs the greedy loop agrees with a brute sweep of the full model", {
  timeout: 4 * 3600_000,
}, async () => {
  await compareWithSweep(10_000, stableDesign, highFriction, { frequencies: 250, sections: 10 });
});
