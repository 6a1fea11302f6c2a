/**
 * Child process: the same work by one thread and by two, in seconds of the clock, and whether the answers are
 * the same numbers. Exit status 1 when they are not.
 */

import { isDeepStrictEqual } from "node:util";
import { statesAt } from "../../src/margin/point-margin.js";
import { createRandom } from "../../src/numerics/random.js";
import { type Crews, crewsOf } from "../../src/tuning/crews.js";
import { settleAt } from "../../src/tuning/judge.js";
import type { ClimbInput } from "../../src/tuning/search-tasks.js";
import { Session } from "../../src/tuning/session.js";
import { ringBrakeProblem, stableDesign } from "../references/ring-brake-problem.js";
import { aligned } from "./table.js";

type Work = (crews: Crews) => Promise<unknown>;

interface Timing {
  readonly seconds: number;
  /** Processor seconds of all threads over seconds of the clock. */
  readonly cores: number;
}

/** Pairs of runs: more while they are short. */
const MOST_RUNS = 5;
const LEAST_RUNS = 2;
const ENOUGH_S = 20;
const FREQUENCIES = 8;
const CLIMBS = 6;

async function table(): Promise<string> {
  const problem = await ringBrakeProblem(10_000);
  const design = new Map([...stableDesign, ["layerB", 0] as const]);
  const session = new Session(problem, design);
  const corners = session.operation.corners.map((u) => session.operation.valuesOf(u));
  session.addExtremeSamples(design, true);
  for (const at of corners) settleAt(session, design, at, 1e-3);

  const state = statesAt(session.model, session.valuesAt(design, corners[0]))(1);
  const shifts = Array.from({ length: FREQUENCIES }, (_, k) => ({
    state,
    re: 0,
    im: 2 * Math.PI * 200 * (k + 1),
  }));
  const climbs = climbInputs(session, design, corners);
  const one = crewsOf(session, 1);
  const two = crewsOf(session, 2);
  const rows: string[][] = [headings];
  try {
    const gains: Work = ({ evidence }) => evidence.run("gain", shifts);
    rows.push(await row(`${FREQUENCIES} complex factorisations with their solves`, gains, one, two));
    const ascents: Work = ({ search }) => search.run("climb", climbs);
    rows.push(
      await row(
        `${CLIMBS} climbs on the reduced model of order ${session.adaptive.order}`,
        ascents,
        one,
        two,
      ),
    );
  } finally {
    await two.close();
  }
  return `two cores, ring brake of ${session.adaptive.full.order} dofs, seed 1, seconds of the clock\n${aligned(rows)}${legend}`;
}

const legend = `spread     how far the slowest run lay above the quickest
cores had  processor seconds over seconds of the clock; clearing of memory and compiling run beside a single thread
`;

const headings = [
  "",
  "1 thread s",
  "spread",
  "cores had",
  "2 threads s",
  "spread",
  "cores had",
  "ratio (goal ≥ 1.7)",
  "results",
];

/** Ascents from where `tune` would begin, much shortened. */
function climbInputs(
  session: Session,
  design: ReadonlyMap<string, number>,
  active: readonly ReadonlyMap<string, number>[],
): ClimbInput[] {
  const { designs, problem } = session;
  const random = createRandom(1);
  const options = {
    reach: 1,
    effort: 0.05,
    tolerance: problem.tune.tolerance,
    exchanges: 0,
    frozen: new Set<number>(),
  };
  return Array.from({ length: CLIMBS }, (_, k) => ({
    start: designs.randomFilling(random, designs.unitOf(design), k % 2 === 1),
    active,
    options,
  }));
}

/** Both ways in turn, so that others on the machine disturb them alike; the first of each warms up. */
async function row(name: string, work: Work, one: Crews, two: Crews): Promise<string[]> {
  const same = isDeepStrictEqual(await work(one), await work(two));
  if (!same) process.exitCode = 1;
  const alone: Timing[] = [];
  const shared: Timing[] = [];
  for (let run = 0, spent = 0; run < LEAST_RUNS || (run < MOST_RUNS && spent < ENOUGH_S); run++) {
    alone.push(await timed(() => work(one)));
    shared.push(await timed(() => work(two)));
    spent += alone[run].seconds + shared[run].seconds;
  }
  const ratio = least(alone).seconds / least(shared).seconds;
  return [
    name,
    ...cells(alone),
    ...cells(shared),
    ratio.toFixed(2),
    same ? "equal to the last digit" : "DIFFERENT",
  ];
}

async function timed(work: () => Promise<unknown>): Promise<Timing> {
  const before = process.cpuUsage();
  const start = performance.now();
  await work();
  const seconds = (performance.now() - start) / 1000;
  const { user, system } = process.cpuUsage(before);
  return { seconds, cores: (user + system) / 1e6 / seconds };
}

function least(timings: readonly Timing[]): Timing {
  return timings.reduce((best, timing) => (timing.seconds < best.seconds ? timing : best));
}

function cells(timings: readonly Timing[]): string[] {
  const { seconds, cores } = least(timings);
  const most = Math.max(...timings.map((timing) => timing.seconds));
  return [seconds.toFixed(2), `+${Math.round(100 * (most / seconds - 1))} %`, cores.toFixed(2)];
}

process.stdout.write(await table());
