import type { Problem } from "../problem/problem.js";
import { crewsOf } from "./crews.js";
import { type Judgement, judge, provisional, settledWorst } from "./judge.js";
import type { MarginCommandResult, TuneCommandResult } from "./result.js";
import { judgedDesign, marginResult, otherMeasures, recordOf } from "./result-builder.js";
import { type ReportProgress, Session } from "./session.js";
import { type Tuned, tune, tuneDefaults } from "./tune.js";

export interface CommandContext {
  readonly version: string;
  readonly progress: ReportProgress;
  /** Threads to compute with; default 1. The result does not depend on it. */
  readonly threads?: number;
  /** Called with a complete result object whenever a better one exists. */
  readonly snapshot: (result: MarginCommandResult | TuneCommandResult) => void;
}

export interface MarginOptions {
  /** Design values that differ from the start values. */
  readonly design?: ReadonlyMap<string, number>;
  /** Operating values to judge at; those not named stay nominal. Without it the envelope is searched. */
  readonly at?: ReadonlyMap<string, number>;
}

export interface TuneCommandOptions {
  /** Default: the problem file's. */
  readonly seed?: number;
  /** Start values that differ from the file's. */
  readonly design?: ReadonlyMap<string, number>;
}

/** The worst vector on the dofs of the problem file (fixed ones left out). */
export interface WorstVector {
  /** Counted from 1, as in the file. */
  readonly dofs: Int32Array;
  readonly re: Float64Array;
  readonly im: Float64Array;
}

/** The smallest margin of one design over the envelope, or at one operating point, with its evidence. */
export async function computeMargin(
  problem: Problem,
  options: MarginOptions,
  context: CommandContext,
): Promise<{ result: MarginCommandResult; vectors: WorstVector | null }> {
  const began = Date.now();
  context.progress({ stage: "building the model and its real modes", done: 0, total: null });
  const design = startDesign(problem, options.design);
  const session = new Session(problem, design);
  return await withThreads(session, context.threads ?? 1, async () => {
    session.addExtremeSamples(design, false);
    const at = options.at === undefined ? undefined : new Map([...session.operation.nominal, ...options.at]);
    const judgement = await judge(session, design, at, [], context.progress);
    context.progress({ stage: "the other measures", done: 0, total: null });
    const result = {
      ...marginResult(session, context.version, design, judgement, began, null),
      measures: otherMeasures(session, design, judgement.at),
    };
    context.snapshot(result);
    return { result, vectors: worstVector(session, judgement) };
  });
}

/** Work with as many threads as wanted, which end with it. */
async function withThreads<Result>(
  session: Session,
  threads: number,
  work: () => Promise<Result>,
): Promise<Result> {
  const crews = crewsOf(session, threads);
  session.crews = crews;
  try {
    return await work();
  } finally {
    await crews.close();
  }
}

/** The best design within the limits, its margin settled on the full model, beside the start design. */
export async function tuneProblem(
  problem: Problem,
  options: TuneCommandOptions,
  context: CommandContext,
): Promise<{ result: TuneCommandResult; vectors: WorstVector | null }> {
  const began = Date.now();
  context.progress({ stage: "building the model and its real modes", done: 0, total: null });
  const design = startDesign(problem, options.design);
  const session = new Session(withStart(problem, design), design);
  const seed = options.seed ?? problem.tune.seed;
  return await withThreads(session, context.threads ?? 1, () =>
    tuneSession(session, design, seed, context, began),
  );
}

async function tuneSession(
  session: Session,
  design: ReadonlyMap<string, number>,
  seed: number,
  context: CommandContext,
  began: number,
): Promise<{ result: TuneCommandResult; vectors: WorstVector | null }> {
  context.progress({ stage: "judging the start design", done: 0, total: null });
  const worst = settledWorst(session, design, []);
  const snapshot = (of: ReadonlyMap<string, number>, at: ReadonlyMap<string, number>, before: Judgement) => {
    const judgement = provisional(session, of, at);
    const trunk = marginResult(session, context.version, of, judgement, began, null);
    const found = { seed, before: judgedDesign(session, design, before), measures: {}, ...nothingFound };
    context.snapshot({ ...trunk, ...found, command: "tune", status: "interrupted" });
    return judgement;
  };
  const first = snapshot(design, worst.at, provisional(session, design, worst.at));
  const search = { ...tuneDefaults, seed, tolerance: session.problem.tune.tolerance };
  const tuned = await tune(
    session,
    worst,
    search,
    context.progress,
    (better, { at }) => void snapshot(better, at, first),
  );
  const { complex, real } = session.adaptive.full.counts;
  const final = session.designs.valuesOf(tuned.best.x);
  const judgement = await judge(session, final, undefined, tuned.best.active, context.progress);
  const before = await judge(session, design, worst.at, [], context.progress);
  context.progress({ stage: "the other measures", done: 0, total: null });
  const trunk = marginResult(session, context.version, final, judgement, began, complex + real);
  const result: TuneCommandResult = {
    ...trunk,
    ...verdictOf(trunk, tuned),
    command: "tune",
    measures: otherMeasures(session, final, judgement.at),
    seed,
    before: judgedDesign(session, design, before),
    history: tuned.history.map((row) => ({ ...row, design: recordOf(row.design), at: recordOf(row.at) })),
    starts: tuned.starts.map(({ x, value }) => ({ value, design: recordOf(session.designs.valuesOf(x)) })),
    rounded: session.designs.isStepped,
  };
  context.snapshot(result);
  return { result, vectors: worstVector(session, judgement) };
}

const nothingFound = { history: [], starts: [], rounded: false };

function verdictOf(trunk: MarginCommandResult, tuned: Tuned): Pick<TuneCommandResult, "doubts" | "status"> {
  const doubts = [...trunk.doubts, ...tuned.doubts];
  return { doubts, status: tuned.infeasible ? "infeasible" : doubts.length > 0 ? "untrusted" : trunk.status };
}

function startDesign(
  problem: Problem,
  changes: ReadonlyMap<string, number> | undefined,
): Map<string, number> {
  return new Map([...problem.design.map(({ name, start }) => [name, start] as const), ...(changes ?? [])]);
}

/** The problem with other start values, so that the search and its report speak of the same start. */
function withStart(problem: Problem, design: ReadonlyMap<string, number>): Problem {
  return { ...problem, design: problem.design.map((v) => ({ ...v, start: design.get(v.name) ?? v.start })) };
}

function worstVector(session: Session, judgement: Judgement): WorstVector | null {
  const { witness } = judgement.point;
  if (witness === undefined) return null;
  const { re, im } = witness.vector;
  return { dofs: session.model.freeDofs.map((dof) => dof + 1), re, im };
}
