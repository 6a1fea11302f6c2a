/**
 * The three costs that make up `margin` and `tune`: a factorisation with solves of the full model, a cold
 * evaluation of the reduced model as searches make it, and one settled point. Ratios between revisions count, not
 * times; the backward error stands in the name because speed without accuracy is no result.
 */

import { bench, describe } from "vitest";
import { statesAt } from "../../src/margin/point-margin.js";
import { complexZeros } from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import { settleAt } from "../../src/tuning/judge.js";
import { Session } from "../../src/tuning/session.js";
import { ringBrakeProblem, stableDesign } from "../references/ring-brake-problem.js";

const problem = await ringBrakeProblem(10_000);
const design = new Map([...stableDesign, ["layerB", 0]]);
const session = new Session(problem, design);
const at = new Map([
  ["friction", 0.55],
  ["pressure", 1],
]);
const pencil = session.adaptive.full.pencilAt(statesAt(session.model, session.valuesAt(design, at))(1));
const omega = 2 * Math.PI * 1000;
const random = createRandom(1);
const load = complexZeros(pencil.order, 12);
for (let i = 0; i < load.re.length; i++) load.re[i] = random.normal();
const solved = () => {
  const b = { ...load, re: load.re.slice(), im: load.im.slice() };
  return pencil.factor(0, omega).solveInPlace(b);
};

describe(`ring brake, ${pencil.order} dofs, seed 1`, () => {
  const options = { iterations: 5, warmupIterations: 1, time: 0 };
  bench(
    `complex factorisation and 12 solves, backward error ${solved().toExponential(1)}`,
    () => void solved(),
    options,
  );
  bench(`reduced evaluation, order ${session.adaptive.order}`, () => void session.estimate(design, at), {
    ...options,
    iterations: 20,
  });
  bench("one operating point settled to 1e-6", () => void settleAt(session, design, at, 1e-6), options);
});
