/** Questions to the full model that need no answer to any other: several threads may share them. */

import type { FullModel } from "../fullorder/full-model.js";
import type { ModelState } from "../model/parametric-model.js";
import { withFactor } from "../model/pencil.js";
import { alone, type Crew } from "../parallel/crew.js";
import { type AxisWalk, type Stretch, walkAxis } from "./axis-walk.js";
import { type ChannelGain, channelGain } from "./channel-gain.js";
import { type Neighbourhood, nearbyEigenvalues } from "./nearby-eigenvalues.js";

/** One shift s = re + i im [1/s, rad/s] of the full model at one state. */
export interface ShiftInput {
  readonly state: ModelState;
  readonly re: number;
  readonly im: number;
}

export interface NeighbourhoodInput extends ShiftInput {
  /** s₀ [rad/s]. */
  readonly scale: number;
  readonly seed: number;
}

export interface WalkInput extends Stretch {
  readonly state: ModelState;
}

export interface FullTasks extends Record<string, (full: FullModel, input: never) => unknown> {
  readonly gain: (full: FullModel, input: ShiftInput) => ChannelGain;
  readonly neighbourhood: (full: FullModel, input: NeighbourhoodInput) => Neighbourhood;
  readonly walk: (full: FullModel, input: WalkInput) => AxisWalk;
}

export const fullTasks: FullTasks = {
  gain: (full, { state, re, im }) => {
    const pencil = full.pencilAt(state);
    return withFactor(pencil, re, im, (factor) => channelGain(pencil, factor));
  },
  neighbourhood: (full, { state, re, im, scale, seed }) => {
    const pencil = full.pencilAt(state);
    return withFactor(pencil, re, im, (factor) => nearbyEigenvalues(pencil, factor, scale, seed));
  },
  walk: (full, input) => walkAxis(full.pencilAt(input.state), input),
};

/** Whoever answers them. */
export type FullCrew = Crew<FullTasks>;

export function fullCrewOf(full: FullModel): FullCrew {
  return alone<FullModel, FullTasks>(fullTasks, full);
}
