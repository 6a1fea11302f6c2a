import { FullModel } from "../fullorder/full-model.js";
import { followPeaks } from "../margin/follow-peaks.js";
import type { Estimate, Measure, Setting } from "../margin/measure.js";
import { type PeakOptions, peakDefaults } from "../margin/peaks.js";
import { measureOf, settingOf, statesAt } from "../margin/point-margin.js";
import {
  buildModel,
  type ModelState,
  type ParametricModel,
  stateAt,
  type Values,
} from "../model/parametric-model.js";
import type { Problem, TermGroup } from "../problem/problem.js";
import { AdaptiveModel } from "../reduction/adaptive-model.js";
import { truncateModes } from "../reduction/modal-truncation.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { type Crews, ownCrews } from "./crews.js";
import { DesignSpace } from "./design-space.js";
import { type OperatingPoint, OperatingSpace, type Resolution } from "./operating-space.js";

/** What a command tells while it works. */
export interface Progress {
  readonly stage: string;
  readonly done: number;
  /** null when unknown. */
  readonly total: number | null;
}

/** What is told of a design by following peaks: the smallest value, and all followed, smallest first. */
export interface Followed {
  readonly value: number;
  readonly criticals: readonly { readonly value: number; readonly omega: number }[];
}

export type ReportProgress = (progress: Progress) => void;

/** One problem being worked on: its model, the reduced model that learns from it, and its two spaces. */
export class Session {
  readonly problem: Problem;
  readonly model: ParametricModel;
  readonly adaptive: AdaptiveModel;
  readonly measure: Measure;
  readonly setting: Setting;
  readonly designs: DesignSpace;
  readonly operation: OperatingSpace;
  /** Who answers the questions that threads may share; this thread alone unless a command hires others. */
  crews: Crews;
  reducedEvaluations = 0;
  /** Real modes of the reduced model are kept up to here [rad/s] while searching; null keeps all. */
  readonly #searchReach: number | null;

  /** @param design - the design at which the start basis is made. */
  constructor(problem: Problem, design: ReadonlyMap<string, number>) {
    this.problem = problem;
    this.model = buildModel(problem);
    this.designs = new DesignSpace(problem);
    this.operation = new OperatingSpace(problem);
    const full = new FullModel(this.model);
    const nominal = this.valuesAt(design, this.operation.nominal);
    const upper = problem.margin.bandHz === null ? null : 2 * Math.PI * problem.margin.bandHz[1];
    this.adaptive = new AdaptiveModel(full, stateAt(this.model, nominal), upper);
    this.measure = measureOf(problem.margin);
    this.setting = settingOf(problem.margin, this.adaptive);
    this.crews = ownCrews(this);
    // Modes that differ along the multiplier would give the two ends of the path different bases.
    const rigid = this.model.terms.every((term) => !term.multiplied || !structural.has(term.group));
    this.#searchReach = upper === null || this.adaptive.exact || !rigid ? null : 1.05 * upper;
  }

  valuesAt(design: ReadonlyMap<string, number>, at: ReadonlyMap<string, number>): Values {
    return new Map([...this.problem.constants, ...design, ...at]);
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
   * estimate; null when they cannot be followed there (`followPeaks`).
   */
  follow(
    design: ReadonlyMap<string, number>,
    at: ReadonlyMap<string, number>,
    known: readonly number[],
  ): Followed | null {
    const pencil = this.#searchPencil(statesAt(this.model, this.valuesAt(design, at))(1));
    const peaks = followPeaks(pencil, known, this.setting.band);
    if (peaks === null) return null;
    this.reducedEvaluations++;
    const criticals = peaks
      .map(({ omega, sigma }) => ({ omega, value: 1 / sigma }))
      .sort((a, b) => a.value - b.value);
    return { value: criticals[0].value, criticals };
  }

  #searchPencil(state: ModelState): DensePencil {
    const pencil = this.adaptive.reducedAt(state);
    return this.#searchReach === null ? pencil : truncateModes(pencil, this.#searchReach);
  }

  /** Worst operating points of a design by the reduced model, worst first. */
  worstPoints(
    design: ReadonlyMap<string, number>,
    known: readonly ReadonlyMap<string, number>[],
    resolution: Resolution,
  ): OperatingPoint[] {
    return this.operation.search((at) => this.estimate(design, at).value, known, resolution);
  }

  /**
   * Real modes at extremes of the parameters that change mass or stiffness: all operating ones low or high,
   * and, when designs will vary, all design ones high or low against them.
   */
  addExtremeSamples(design: ReadonlyMap<string, number>, varyDesign: boolean): void {
    const structural = structuralNames(this.model);
    const moving = (names: readonly { readonly name: string }[]) =>
      names.some(({ name }) => structural.has(name));
    const operating = moving(this.operation.parameters) ? [0, 1] : [];
    const designed = varyDesign && moving(this.designs.variables);
    const fill = (space: { readonly length: number }, level: number) =>
      new Array<number>(space.length).fill(level);
    const at = (level: number) => this.operation.valuesOf(fill(this.operation.parameters, level));
    const designAt = (level: number) => this.designs.valuesOf(fill(this.designs.variables, level));
    const samples: [ReadonlyMap<string, number>, ReadonlyMap<string, number>][] = [];
    for (const level of operating) samples.push([designed ? designAt(1 - level) : design, at(level)]);
    if (designed) samples.push([designAt(1), operating.length > 0 ? at(1) : this.operation.nominal]);
    for (const [d, o] of samples) this.adaptive.addSample(stateAt(this.model, this.valuesAt(d, o)));
  }
}

/** While searching, a peak's frequency is wanted to a thousandth of the narrowest peak only. */
const searchPeaks: PeakOptions = { ...peakDefaults, screen: 0.25, accuracy: 1e-6 };

const structural: ReadonlySet<TermGroup> = new Set(["mass", "stiffness"]);

function structuralNames(model: ParametricModel): Set<string> {
  return new Set(
    model.terms.filter((term) => structural.has(term.group)).flatMap((term) => term.factor.names),
  );
}
