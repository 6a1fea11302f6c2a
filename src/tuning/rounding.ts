import { climb } from "./climb.js";
import { settledWorst } from "./judge.js";
import type { Incumbent } from "./rounds.js";
import type { Session } from "./session.js";

const mostNeighbours = 64;
const polished = 3;

/**
 * Stepped variables put on their steps: the feasible neighbours of the incumbent are judged by the reduced
 * model, the best few get their continuous variables climbed again, and the full model picks among them.
 * Undefined when no neighbour is feasible.
 */
export async function roundToSteps(
  session: Session,
  incumbent: Incumbent,
  tolerance: number,
): Promise<Incumbent | undefined> {
  const { designs } = session;
  const frozen = new Set(designs.variables.flatMap(({ step }, i) => (step === null ? [] : [i])));
  const ranked = designs
    .steppedNeighbours(incumbent.x, mostNeighbours)
    .filter((x) => designs.isFeasible(x))
    .map((x) => ({
      x,
      value: Math.min(...incumbent.active.map((at) => session.estimate(designs.valuesOf(x), at).value)),
    }))
    .sort((a, b) => b.value - a.value);
  let best: Incumbent | undefined;
  for (const { x } of ranked.slice(0, polished)) {
    const options = { reach: 0.3, effort: 0.55, tolerance, exchanges: 2, frozen };
    const climbed = await climb(session, x, incumbent.active, options);
    const worst = settledWorst(session, designs.valuesOf(climbed.x), climbed.active, "coarse", tolerance);
    if (best === undefined || worst.value > best.worst.value)
      best = { x: climbed.x, worst, active: climbed.active };
  }
  return best;
}
