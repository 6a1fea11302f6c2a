/** A local maximum of σ_max(H(iω)) over the band. */
export interface Peak {
  /** [rad/s] */
  readonly omega: number;
  /** Infinity when the gain grows without bound towards infinite frequency; `omega` is just far up then. */
  readonly sigma: number;
}

export interface PolishOptions {
  /** Relative accuracy of the frequency. Default 1e-9. */
  readonly accuracy: number;
  /** First steps to either side [rad/s]: half the half width of a resonance serves best. Default 0: a golden section. */
  readonly step: number;
}

export const polishDefaults: PolishOptions = { accuracy: 1e-9, step: 0 };

/** Heights closer than this, relative, differ by rounding only. */
const sameHeight = 1e-15;

/**
 * Local maximum in [low, high] that is no lower than at `start`, by parabolic steps safeguarded with golden
 * sections. The parabolas go through 1/σ², which of a single resonance is one exactly.
 *
 * Source: Brent, Algorithms for Minimization without Derivatives, 1973, ch. 5.
 */
// biome-ignore lint/complexity/noExcessiveCognitiveComplexity: Brent's method is one small state machine
export function polishPeak(
  gain: (omega: number) => number,
  low: number,
  start: number,
  high: number,
  sigmaAtStart: number,
  { accuracy, step: first }: PolishOptions = polishDefaults,
): Peak {
  const golden = 0.381966011250105;
  let a = low;
  let b = high;
  let x = start;
  let w = start;
  let v = start;
  let fx = sigmaAtStart;
  let fw = fx;
  let fv = fx;
  let step = 0;
  let before = 0;
  for (let iteration = 0; iteration < 60; iteration++) {
    const middle = 0.5 * (a + b);
    const tolerance = accuracy * Math.abs(x) + 1e-300;
    if (Math.abs(x - middle) <= 2 * tolerance - 0.5 * (b - a)) break;
    // The second of the two given steps goes on from a success and to the other side of a failure.
    const given = iteration === 0 || x !== start ? first : -first;
    const parabolic = iteration < 2 ? given : parabolicStep(x, fx, w, fw, v, fv);
    const useful =
      (iteration < 3 || Math.abs(parabolic) < Math.abs(0.5 * before)) &&
      x + parabolic > a &&
      x + parabolic < b &&
      parabolic !== 0;
    before = useful ? step : x >= middle ? a - x : b - x;
    step = useful ? parabolic : golden * before;
    const u = x + (Math.abs(step) >= tolerance ? step : step >= 0 ? tolerance : -tolerance);
    const fu = gain(u);
    if (fu >= fx) {
      if (u >= x) a = x;
      else b = x;
      [v, fv, w, fw, x, fx] = [w, fw, x, fx, u, fu];
    } else {
      if (u < x) a = u;
      else b = u;
      if (fu >= fw || w === x) [v, fv, w, fw] = [w, fw, u, fu];
      else if (fu >= fv || v === x || v === w) [v, fv] = [u, fu];
    }
  }
  // Between equal heights the iteration wanders off by a rounding error; ω = 0 is to stay ω = 0.
  return fx > sigmaAtStart * (1 + sameHeight)
    ? { omega: x, sigma: fx }
    : { omega: start, sigma: sigmaAtStart };
}

/** Step from x to the vertex of the parabola through the three points (ω, 1/σ²); 0 or NaN when there is none. */
function parabolicStep(
  x: number,
  sigmaX: number,
  w: number,
  sigmaW: number,
  v: number,
  sigmaV: number,
): number {
  // Differences of 1/σ² in units of 1/σ(x)²: 1 − (σ(x)/σ)².
  const ratioV = sigmaX / sigmaV;
  const ratioW = sigmaX / sigmaW;
  const r = (x - w) * (1 - ratioV) * (1 + ratioV);
  const q = (x - v) * (1 - ratioW) * (1 + ratioW);
  const denominator = 2 * (q - r);
  return denominator === 0 ? 0 : -((x - v) * q - (x - w) * r) / denominator;
}
