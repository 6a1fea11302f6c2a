import { followPeaks } from "../margin/follow-peaks.js";
import type { Estimate, Measure, Setting } from "../margin/measure.js";
import { type PeakOptions, peakDefaults } from "../margin/peaks.js";
import { measureOf, statesAt } from "../margin/point-margin.js";
import type { ModelState, ParametricModel, Values } from "../model/parametric-model.js";
import type { Problem } from "../problem/problem.js";
import { truncateModes } from "../reduction/modal-truncation.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { DesignSpace } from "./design-space.js";
import { type OperatingPoint, OperatingSpace, type Resolution } from "./operating-space.js";

/** What is told of a design by following peaks: the smallest value, and all followed, smallest first. */
export interface Followed {
  readonly value: number;
  readonly criticals: readonly { readonly value: number; readonly omega: number }[];
}

/** What a search model is made of. */
export interface SearchParts {
  readonly problem: Problem;
  readonly model: ParametricModel;
  readonly setting: Setting;
  /** Real modes of the reduced model are kept up to here [rad/s] while searching; null keeps all. */
  readonly reach: number | null;
  readonly reducedAt: (state: ModelState) => DensePencil;
}

/** A problem as a search sees it: the reduced model's word on any design at any operating point. */
export class SearchModel {
  readonly problem: Problem;
  readonly model: ParametricModel;
  readonly measure: Measure;
  readonly setting: Setting;
  readonly designs: DesignSpace;
  readonly operation: OperatingSpace;
  readonly reach: number | null;
  reducedEvaluations = 0;
  readonly #reducedAt: (state: ModelState) => DensePencil;

  constructor({ problem, model, setting, reach, reducedAt }: SearchParts) {
    this.problem = problem;
    this.model = model;
    this.measure = measureOf(problem.margin);
    this.setting = setting;
    this.designs = new DesignSpace(problem);
    this.operation = new OperatingSpace(problem);
    this.reach = reach;
    this.#reducedAt = reducedAt;
  }

  valuesAt(design: ReadonlyMap<string, number>, at: ReadonlyMap<string, number>): Values {
    return allValues(this.problem, design, at);
  }

  /** The reduced model's word at one design and operating point, by its modes in the band only: for searching. */
  estimate(design: ReadonlyMap<string, number>, at: ReadonlyMap<string, number>): Estimate {
    this.reducedEvaluations++;
    const states = statesAt(this.model, this.valuesAt(design, at));
    const pencilAt = (multiplier: number) => this.#searchPencil(states(multiplier));
    return this.measure.estimate(pencilAt, { ...this.setting, peaks: searchPeaks });
  }

  /**
   * Values of known peaks at a design and operating point close to where they were found, far cheaper than an
   * estimate of a large model; null when they cannot be followed there (`followPeaks`), or the model is so small that an
   * estimate costs no more.
   */
  follow(
    design: ReadonlyMap<string, number>,
    at: ReadonlyMap<string, number>,
    known: readonly number[],
  ): Followed | null {
    const pencil = this.#searchPencil(statesAt(this.model, this.valuesAt(design, at))(1));
    if (pencil.order < worthFollowing) return null;
    const peaks = followPeaks(pencil, known, this.setting.band, followed * this.problem.tune.tolerance);
    if (peaks === null) return null;
    this.reducedEvaluations++;
    const criticals = peaks
      .map(({ omega, sigma }) => ({ omega, value: 1 / sigma }))
      .sort((a, b) => a.value - b.value);
    return { value: criticals[0].value, criticals };
  }

  #searchPencil(state: ModelState): DensePencil {
    const pencil = this.#reducedAt(state);
    return this.reach === null ? pencil : truncateModes(pencil, this.reach);
  }

  /** Worst operating points of a design by the reduced model, worst first. */
  worstPoints(
    design: ReadonlyMap<string, number>,
    known: readonly ReadonlyMap<string, number>[],
    resolution: Resolution,
  ): OperatingPoint[] {
    return this.operation.search((at) => this.estimate(design, at).value, known, resolution);
  }
}

/** Every name with its value. */
export function allValues(
  problem: Problem,
  design: ReadonlyMap<string, number>,
  at: ReadonlyMap<string, number>,
): Values {
  return new Map([...problem.constants, ...design, ...at]);
}

/** Order of a pencil from which on following is much cheaper than a search, whose cost grows like its cube times eight. */
const worthFollowing = 40;

/** Accuracy of followed peaks, as a share of the tolerance of tuning. */
const followed = 0.02;

/** While searching, a peak's frequency is wanted to a thousandth of the narrowest peak only. */
const searchPeaks: PeakOptions = { ...peakDefaults, screen: 0.25, accuracy: 1e-6 };
