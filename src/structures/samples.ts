import { ringBrake } from "./ring-brake.js";
import { crossCoupledRotor } from "./rotor.js";
import type { SampleModel } from "./sample-model.js";
import { twoModeFriction } from "./two-mode-friction.js";

export interface Sample {
  /** One line for the command's help. */
  readonly summary: string;
  readonly defaultDofs: number;
  /** Samples of one fixed size take no notice of `dofs`. */
  build(dofs: number): SampleModel;
}

/** The demonstration problems by name. */
export const samples: ReadonlyMap<string, Sample> = new Map([
  [
    "ring-brake",
    {
      summary: "azimuth ring brake of a radio telescope, a finite-element model of any size",
      defaultDofs: 1000,
      build: ringBrake,
    },
  ],
  [
    "friction-oscillator",
    {
      summary: "two modes coupled by friction, with the critical friction in closed form",
      defaultDofs: 2,
      build: twoModeFriction,
    },
  ],
  [
    "cross-coupled-rotor",
    {
      summary: "rotor with cross-coupled stiffness, with the critical load in closed form",
      defaultDofs: 2,
      build: crossCoupledRotor,
    },
  ],
]);
