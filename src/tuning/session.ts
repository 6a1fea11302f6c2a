import { FullModel } from "../fullorder/full-model.js";
import { settingOf } from "../margin/point-margin.js";
import { buildModel, type ParametricModel, stateAt } from "../model/parametric-model.js";
import type { Problem, TermGroup } from "../problem/problem.js";
import { AdaptiveModel } from "../reduction/adaptive-model.js";
import { type Crews, ownCrews } from "./crews.js";
import { OperatingSpace } from "./operating-space.js";
import { allValues, SearchModel } from "./search-model.js";

/** What a command tells while it works. */
export interface Progress {
  readonly stage: string;
  readonly done: number;
  /** null when unknown. */
  readonly total: number | null;
}

export type ReportProgress = (progress: Progress) => void;

/** One problem being worked on: what a search sees of it, and the full model that the reduced one learns from. */
export class Session extends SearchModel {
  readonly adaptive: AdaptiveModel;
  /** Who answers the questions that threads may share; this thread alone unless a command hires others. */
  crews: Crews;

  /** @param design - the design at which the start basis is made. */
  constructor(problem: Problem, design: ReadonlyMap<string, number>) {
    const model = buildModel(problem);
    const start = stateAt(model, allValues(problem, design, new OperatingSpace(problem).nominal));
    const upper = problem.margin.bandHz === null ? null : 2 * Math.PI * problem.margin.bandHz[1];
    const adaptive = new AdaptiveModel(new FullModel(model), start, upper);
    // Modes that differ along the multiplier would give the two ends of the path different bases.
    const rigid = model.terms.every((term) => !term.multiplied || !structural.has(term.group));
    super({
      problem,
      model,
      setting: settingOf(problem.margin, adaptive),
      reach: upper === null || adaptive.exact || !rigid ? null : 1.05 * upper,
      reducedAt: (state) => adaptive.reducedAt(state),
    });
    this.adaptive = adaptive;
    this.crews = ownCrews(this);
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

const structural: ReadonlySet<TermGroup> = new Set(["mass", "stiffness"]);

function structuralNames(model: ParametricModel): Set<string> {
  return new Set(
    model.terms.filter((term) => structural.has(term.group)).flatMap((term) => term.factor.names),
  );
}
