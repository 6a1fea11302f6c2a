import { decay } from "../margin/decay.js";
import type { Measure } from "../margin/measure.js";
import { multiplier } from "../margin/multiplier.js";
import { statesAt } from "../margin/point-margin.js";
import { powerBalance } from "../margin/power-balance.js";
import { radius } from "../margin/radius.js";
import { settle, settleDefaults } from "../margin/settle.js";
import { dampingRatio } from "../margin/stability.js";
import { stateAt } from "../model/parametric-model.js";
import type { Judgement } from "./judge.js";
import {
  type BalanceRow,
  cautions,
  type JudgedDesign,
  type MarginCommandResult,
  type MarginResult,
  type UnperturbedResult,
} from "./result.js";
import type { Session } from "./session.js";
import { unitsOf } from "./units.js";

export function recordOf(values: ReadonlyMap<string, number>): Record<string, number> {
  return Object.fromEntries(values);
}

const hz = (omega: number) => omega / (2 * Math.PI);
const finite = (value: number) => (Number.isFinite(value) ? value : null);

/** Margin, design, budget and unperturbed stability of one judged design. */
export function judgedDesign(
  session: Session,
  design: ReadonlyMap<string, number>,
  judgement: Judgement,
): JudgedDesign {
  const budget = [...session.designs.useOf(design)].map(([name, use]) => [name, { ...use }] as const);
  return {
    margin: marginOf(session, judgement),
    design: recordOf(design),
    budget: Object.fromEntries(budget),
    unperturbed: unperturbedOf(judgement),
  };
}

/** The complete result of `margin`, and the trunk of that of `tune`; `measures` is left to the caller. */
export function marginResult(
  session: Session,
  version: string,
  design: ReadonlyMap<string, number>,
  judgement: Judgement,
  began: number,
  factorisationsBeforeAudit: number | null,
): MarginCommandResult {
  const { problem, adaptive } = session;
  const { point } = judgement;
  const { complex, real } = adaptive.full.counts;
  return {
    format: "dampwright-result/1",
    command: "margin",
    version,
    title: problem.title,
    units: unitsOf(problem),
    status: judgement.doubts.length === 0 ? "trusted" : "untrusted",
    ...judgedDesign(session, design, judgement),
    measures: {},
    competing: point.settled.estimate.criticals
      .slice(0, 8)
      .map(({ omega, value }) => ({ hz: hz(omega), value })),
    witness:
      point.witness === undefined ? null : { residual: point.witness.residual, size: point.witness.size },
    audit: {
      worst: point.audit.worst,
      evaluations: point.audit.evaluations,
      frequenciesHz: point.audit.frequencies.map(hz),
      envelope: judgement.envelope.map(({ at, value }) => ({ at: recordOf(at), value: finite(value) })),
      levelSetClean: point.levelSetClean,
    },
    balance: balanceOf(session, design, judgement),
    convergence: point.settled.records.map(({ omega, reduced, full, order }) => ({
      hz: hz(omega),
      reduced,
      full,
      reducedOrder: order,
    })),
    doubts: judgement.doubts,
    warnings: warningsOf(session, design, judgement),
    cautions,
    model: {
      dofs: session.model.order,
      modesCounted: adaptive.modeCounts[0]?.count ?? null,
      searchedToHz: finite(hz(adaptive.searchedTo)),
    },
    effort: {
      factorisations: complex + real,
      complexFactorisations: complex,
      realFactorisations: real,
      factorisationsBeforeAudit,
      reducedOrder: adaptive.order,
      reducedEvaluations: session.reducedEvaluations,
      seconds: (Date.now() - began) / 1000,
    },
    inputs: problem.inputs,
  };
}

/** The measures that apply beside the leading one, settled at one operating point. */
export function otherMeasures(
  session: Session,
  design: ReadonlyMap<string, number>,
  at: ReadonlyMap<string, number>,
): Record<string, number | null> {
  const applicable: [string, Measure, boolean][] = [
    ["radius", radius, session.model.blocks.length > 0],
    ["multiplier", multiplier, session.model.terms.some((term) => term.multiplied)],
    ["dampingRatio", decay("ratio"), true],
  ];
  const states = statesAt(session.model, session.valuesAt(design, at));
  return Object.fromEntries(
    applicable
      .filter(
        ([, measure, applies]) =>
          applies && (measure.name === "decay" || measure.name !== session.measure.name),
      )
      .map(([name, measure]) => {
        const options = { ...settleDefaults, tolerance: 1e-6 };
        return [name, finite(settle(session.adaptive, measure, states, session.setting, options).value)];
      }),
  );
}

function marginOf(session: Session, { at, point }: Judgement): MarginResult {
  const { margin, perturbations } = session.problem;
  const { value, between, omega } = point;
  const kinds = new Set(perturbations.map(({ kind }) => kind));
  const structured = point.measure === "radius" && (perturbations.length > 1 || !kinds.has("complex"));
  const kind = { radius: "complex", decay: margin.as, multiplier: null }[point.measure];
  return {
    value: finite(value),
    between: [finite(between[0]), finite(between[1])],
    measure: point.measure,
    kind,
    lowerBound: structured && value > 0,
    loss: point.loss,
    breaksAtHz: omega === null ? null : hz(omega),
    at: recordOf(at),
    target: margin.target,
    meetsTarget: margin.target === null ? null : value >= margin.target,
  };
}

function unperturbedOf({ point }: Judgement): UnperturbedResult {
  const { unstable, unstableOutside, abscissa, onAxis, leastDamped, examined } = point.stability;
  return {
    stable: unstable === 0,
    unstable,
    unstableOutside,
    abscissa: finite(abscissa),
    onAxis,
    leastDamped: leastDamped.map(({ re, im }) => ({ hz: hz(im), ratio: dampingRatio(re, im) })),
    examined,
  };
}

function balanceOf(
  session: Session,
  design: ReadonlyMap<string, number>,
  { at, point }: Judgement,
): readonly BalanceRow[] {
  if (point.decisive === undefined) return [];
  const factor = point.measure === "multiplier" && Number.isFinite(point.value) ? point.value : 1;
  const state = stateAt(session.model, session.valuesAt(design, at), factor);
  const pencil = session.adaptive.full.pencilAt(state);
  return powerBalance(session.model, state, pencil, point.decisive).rows.map((row) => ({ ...row }));
}

/** Terms that act at the decisive frequency although their factor no longer holds there. */
function outsideValidity(
  session: Session,
  design: ReadonlyMap<string, number>,
  { at, point: { omega } }: Judgement,
): string[] {
  if (omega === null) return [];
  const { coefficients } = stateAt(session.model, session.valuesAt(design, at));
  return session.problem.terms.flatMap(({ name, validToHz }, k) => {
    if (validToHz === null || hz(omega) <= validToHz || coefficients[k] === 0) return [];
    const [limit, place] = [validToHz, hz(omega)].map((value) => Number(value.toPrecision(6)));
    return [
      `The answer lies at ${place} Hz, but the factor of term "${name}" holds up to ${limit} Hz only: outside its validity.`,
    ];
  });
}

function warningsOf(session: Session, design: ReadonlyMap<string, number>, judgement: Judgement): string[] {
  const { problem } = session;
  const { point } = judgement;
  const { stability } = point;
  const warnings = outsideValidity(session, design, judgement);
  if (stability.unstableOutside > 0) {
    warnings.push(
      `${stability.unstableOutside} unstable eigenvalues lie outside the band; the verdict is about the band only.`,
    );
  }
  if (stability.onAxis > 0)
    warnings.push(`${stability.onAxis} modes in the band lie on the axis: no damping reaches them.`);
  if (point.measure === "radius" && problem.perturbations.length > 1) {
    warnings.push(
      "Several declared errors are answered by one complex block over all of them: a lower bound of the true radius.",
    );
  } else if (point.measure === "radius" && problem.perturbations.some(({ kind }) => kind !== "complex")) {
    warnings.push(
      "A declared error of this kind is answered by the complex radius: a lower bound of the true radius.",
    );
  }
  if (problem.margin.bandHz === null && !session.adaptive.exact) {
    warnings.push(
      "The model is too large to be judged at all frequencies at once: only those up to the highest searched count.",
    );
  }
  return warnings;
}
