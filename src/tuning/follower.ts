import { sizeOf } from "../margin/measure.js";
import type { Followed, SearchModel } from "./search-model.js";

/** Peaks are followed up to this distance from the design searched last, share of each range. */
const reach = 0.04;

/** Competitors up to this multiple of the smallest value are followed, and the strongest few in any case. */
const competing = 1.15;
const fewest = 3;

/** With more competitors than this a search costs no more. */
const most = 6;

/** A value that moved further than this share of its size (`sizeOf`) is asked of a search. */
const calm = 0.15;

/**
 * The reduced model's word along an ascent at one operating point. Near a design that was searched its peaks
 * are followed; anything that points to a change of scene (`followPeaks`, a step too far, a value that moved much) has
 * the design searched instead. Of the peaks that were far below, the last search stands. So the value that is followed is
 * an upper bound of the margin: enough to dismiss a design by, while one that promises something is to be searched.
 */
export class Follower {
  readonly #model: SearchModel;
  readonly #at: ReadonlyMap<string, number>;
  #searched:
    | { readonly x: readonly number[]; readonly found: Followed; readonly peaks: readonly number[] }
    | undefined;

  constructor(model: SearchModel, at: ReadonlyMap<string, number>) {
    this.#model = model;
    this.#at = at;
  }

  /** @param x - the design as a point of the unit space. */
  at(x: readonly number[], design: ReadonlyMap<string, number>): Followed {
    return this.#follow(x, design) ?? this.search(x, design);
  }

  #follow(x: readonly number[], design: ReadonlyMap<string, number>): Followed | null {
    const last = this.#searched;
    if (last === undefined || last.peaks.length === 0) return null;
    if (x.some((xi, i) => Math.abs(xi - last.x[i]) > reach)) return null;
    const followed = this.#model.follow(design, this.#at, last.peaks);
    if (followed === null) return null;
    const { value, criticals } = last.found;
    if (Math.abs(followed.value - value) > calm * sizeOf(value, this.#model.setting)) return null;
    return { ...followed, criticals: [...followed.criticals, ...criticals.slice(last.peaks.length)] };
  }

  /** The same by a search, without another one where `at` has just made it. */
  search(x: readonly number[], design: ReadonlyMap<string, number>): Followed {
    if (this.#searched?.x === x) return this.#searched.found;
    const found = this.#model.estimate(design, this.#at);
    const { value, criticals } = found;
    const count = Math.max(
      fewest,
      criticals.filter((critical) => critical.value <= competing * value).length,
    );
    const stable = criticals.every((critical) => critical.kind === "peak");
    const peaks = stable && count <= most ? criticals.slice(0, count).map(({ omega }) => omega) : [];
    this.#searched = { x, found, peaks };
    return found;
  }
}
