/** Searches on the reduced model that do not depend on each other: several threads may share them. */

import { alone, type Crew } from "../parallel/crew.js";
import { type Climbed, type ClimbOptions, climb } from "./climb.js";
import type { SearchModel } from "./search-model.js";

export interface ClimbInput {
  readonly start: readonly number[];
  readonly active: readonly ReadonlyMap<string, number>[];
  readonly options: ClimbOptions;
}

export interface TrialInput {
  /** Point of the unit design space. */
  readonly x: readonly number[];
  /** Operating points in the order of asking. */
  readonly points: readonly ReadonlyMap<string, number>[];
  /** At or below this value the design is given up. */
  readonly bar: number;
}

export interface Trial {
  /** Smallest margin over the points, or the first one found at or below the bar. */
  readonly value: number;
  /** Place of the point at which the design was given up, null when it was not. */
  readonly failedAt: number | null;
}

export interface SearchTasks extends Record<string, (search: SearchModel, input: never) => unknown> {
  readonly climb: (search: SearchModel, input: ClimbInput) => Promise<Climbed>;
  readonly trial: (search: SearchModel, input: TrialInput) => Trial;
}

export const searchTasks: SearchTasks = {
  climb: (search, { start, active, options }) => climb(search, start, active, options),
  trial: (search, { x, points, bar }) => {
    const design = search.designs.valuesOf(x);
    let value = Number.POSITIVE_INFINITY;
    for (let k = 0; k < points.length; k++) {
      value = Math.min(value, search.estimate(design, points[k]).value);
      if (value <= bar) return { value, failedAt: k };
    }
    return { value, failedAt: null };
  },
};

export type SearchCrew = Crew<SearchTasks>;

export function searchCrewOf(search: SearchModel): SearchCrew {
  return alone<SearchModel, SearchTasks>(searchTasks, search);
}
