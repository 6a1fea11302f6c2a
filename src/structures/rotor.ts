import type { SampleModel } from "./sample-model.js";

const NOTES = `A rotor on equal bearings whose seal pushes it sideways: N = q [0 1; -1 0], the cross-coupled stiffness of Childs, Turbomachinery Rotordynamics (1993).
M = m I, D = c I, K = k I. In z = x + iy the whirl obeys m z'' + c z' + (k - i q) z = 0, and its circle first keeps its size at omega = sqrt(k/m), where
q* = c sqrt(k/m).
With m = 10 kg, k = 4e6 N/m, c = 400 N s/m: q* = 252 982.2 N/m at 100.658 Hz. The file has q = 1e5 N/m, so the critical multiplier is 2.529822.
The logarithmic decrement is 0.19879 without cross-coupling, 0.12017 at q = 1e5 N/m, 0.04159 at q = 2e5 N/m.`;

/** The rotor with cross-coupled stiffness and its closed-form critical load, in the file's notes. */
export function crossCoupledRotor(): SampleModel {
  return {
    name: "cross-coupled-rotor",
    problem: {
      format: "dampwright/1",
      title: "Rotor with cross-coupling",
      notes: NOTES,
      dofs: 2,
      matrices: {
        unit: {
          entries: [
            [1, 1, 1],
            [2, 2, 1],
          ],
        },
        whirl: {
          entries: [
            [1, 2, 1],
            [2, 1, -1],
          ],
        },
      },
      constants: { m: 10, c: 400, k: 4e6, q: 1e5 },
      terms: {
        mass: [{ matrix: "unit", factor: "m" }],
        damping: [{ matrix: "unit", factor: "c" }],
        stiffness: [{ matrix: "unit", factor: "k" }],
        circulatory: [{ matrix: "whirl", factor: "q" }],
      },
      margin: { measure: "multiplier", target: 2 },
    },
    matrices: new Map(),
  };
}
