/**
 * Child process: the three costs that make up `margin` and `tune`: a factorisation with solves of the full model, a cold
 * evaluation of the reduced model as searches make it, and one settled point. Ratios between revisions count,
 * not times; the backward error stands beside because speed without accuracy is no result.
 */

import { statesAt } from "../../src/margin/point-margin.js";
import { complexZeros } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import { settleAt } from "../../src/tuning/judge.js";
import { Session } from "../../src/tuning/session.js";
import { ringBrakeProblem, stableDesign } from "../references/ring-brake-problem.js";
import { BLOCK } from "./row.js";

async function table(): Promise<string> {
  const problem = await ringBrakeProblem(10_000);
  const design = new Map([...stableDesign, ["layerB", 0] as const]);
  const session = new Session(problem, design);
  const at = new Map([
    ["friction", 0.55],
    ["pressure", 1],
  ]);
  const pencil = session.adaptive.full.pencilAt(statesAt(session.model, session.valuesAt(design, at))(1));
  const omega = 2 * Math.PI * 1000;
  const random = createRandom(1);
  const load = complexZeros(pencil.order, BLOCK);
  for (let i = 0; i < load.re.length; i++) load.re[i] = random.normal();
  const solve = () =>
    pencil.factor(0, omega).solveInPlace({ ...load, re: load.re.slice(), im: load.im.slice() });
  return [
    `ring brake, ${pencil.order} dofs, seed 1\n`,
    line(`complex factorisation and ${BLOCK} solves, backward error ${solve().toExponential(1)}`, 5, solve),
    line(`reduced evaluation, order ${session.adaptive.order}`, 20, () => session.estimate(design, at)),
    line("one operating point settled to 1e-6", 5, () => settleAt(session, design, at, 1e-6)),
  ].join("");
}

function line(name: string, runs: number, work: () => unknown): string {
  work();
  const ms = Array.from({ length: runs }, () => {
    const start = performance.now();
    work();
    return performance.now() - start;
  }).sort((a, b) => a - b);
  const [least, median, most] = [ms[0], ms[runs >> 1], ms[runs - 1]].map((t) => t.toFixed(1));
  return `  ${name}: least ${least} ms, median ${median} ms, most ${most} ms\n`;
}

process.stdout.write(await table());
