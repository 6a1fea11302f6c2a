import { describe, it } from "vitest";
import { compareWithSweep, highFriction, lowFriction } from "./brute-sweep-case.js";
import { stableDesign } from "./ring-brake-problem.js";

/** The greedy loop against full solves all over the band. */
const agreement =
  "on the ring brake of 1000 dofs the greedy loop agrees with a brute sweep of the full model";

// Some 1 500 full factorisations each: half a minute here, several on a slow machine.
describe(agreement, { timeout: 900_000 }, () => {
  it("for a design with dashpots and layers", async () => {
    await compareWithSweep(1000, stableDesign, highFriction, { frequencies: 200, sections: 10 });
  });

  it("for the start design at low friction, where every mode is hardly damped", async () => {
    await compareWithSweep(1000, new Map(), lowFriction, { frequencies: 200, sections: 10 });
  });
});
