import type { SampleModel } from "./sample-model.js";

const NOTES = `A block on a moving belt, held by springs so that its two motions couple: the smallest model that friction alone makes flutter.
M = I, D = damping I, K = [k11 k12; k12 k22], N = friction [0 -k3; 0 0], friction 1 in the file, so that the multiplier alpha is the critical friction coefficient itself.
With equal damping d of both coordinates the eigenvalues obey s^2 + d s = -lambda, lambda those of K + alpha N. Flutter begins not where lambda turns complex but a little later, where Im(lambda)^2 = d^2 Re(lambda).
Closed form: (k11 - k22)^2 / 4 + k12 (k12 - alpha k3) = -d^2 (k11 + k22) / 2, so
alpha = [k12 + (k11 - k22)^2 / (4 k12) + d^2 (k11 + k22) / (2 k12)] / k3.
With k11 = 3, k12 = 1, k22 = 7/3, k3 = 4/3, d = 0.1: alpha = 64/75 = 0.853333..., at omega^2 = 8/3, 0.259899 Hz. Without damping: 5/6 = 0.833333...
Source of the model: Hoffmann, Fischer, Allgaier, Gaul, Mechanics Research Communications 29 (2002).`;

/** The friction oscillator with two modes and its closed-form critical friction, in the file's notes. */
export function twoModeFriction(): SampleModel {
  return {
    name: "friction-oscillator",
    problem: {
      format: "dampwright/1",
      title: "Two-mode friction oscillator",
      notes: NOTES,
      dofs: 2,
      matrices: {
        unit: {
          entries: [
            [1, 1, 1],
            [2, 2, 1],
          ],
        },
        along: { entries: [[1, 1, 1]] },
        across: { entries: [[2, 2, 1]] },
        coupling: {
          entries: [
            [1, 2, 1],
            [2, 1, 1],
          ],
        },
        rub: { outer: { left: [[1, -1]], right: [[2, 1]] } },
      },
      constants: { damping: 0.1, friction: 1, k11: 3, k12: 1, k22: 7 / 3, k3: 4 / 3 },
      terms: {
        mass: [{ matrix: "unit" }],
        damping: [{ matrix: "unit", factor: "damping" }],
        stiffness: [
          { matrix: "along", factor: "k11" },
          { matrix: "coupling", factor: "k12" },
          { matrix: "across", factor: "k22" },
        ],
        circulatory: [{ matrix: "rub", factor: "friction*k3" }],
      },
      margin: { measure: "multiplier", target: 0.8 },
    },
    matrices: new Map(),
  };
}
