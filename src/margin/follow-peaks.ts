import { applyPencilDerivative, type Pencil } from "../model/pencil.js";
import { innerProduct } from "../numerics/dense/complex-vectors.js";
import { type ComplexVector, complexVector } from "../numerics/dense/matrix.js";
import { applyComplex } from "../numerics/real-operator.js";
import { type Band, inBand } from "./band.js";
import { type ChannelGain, channelGain } from "./channel-gain.js";
import type { Peak } from "./polish-peak.js";

/** Factorisations that one peak may take. */
const mostSteps = 6;

/**
 * Distance from a peak, in half widths, from which the pole no longer tells the height: the correction is half the square of
 * the distance, and a tenth of that may be the doing of other poles.
 */
const farthest = 0.03;
const leftOver = 0.05;

/** Damping ratio of a pole from which on it blends with what is around: such peaks are left to a search. */
const wellDamped = 0.05;

/** Peaks closer than this, relative, have run into one another. */
const merged = 1e-4;

/**
 * Local maxima of σ_max(H(iω)) near those of a similar pencil, by two or three solves each and no eigenvalues. As if one
 * pole λ made the peak, H ≈ R/(s − λ), each solve tells the pole,
 *
 *     λ = s + σ/h′,   h′ = uᴴ H′(s) v = −yᴴP′(s)x + yᴴB′(s)v,
 *
 * and Im λ is the next frequency. It stands still where σ does, whatever else takes part, since dσ/dω = −Im h′.
 *
 * @param known - frequencies of the peaks at the similar pencil [rad/s].
 * @param accuracy - relative accuracy wanted in a height.
 * @returns the peaks in the order of `known`; null when one left the band, met another or did not settle, or when the pole
 * behind one lies on the axis or right of it. A peak that is not followed goes unseen, and with it an instability that none
 * of those followed shows: for searching only.
 */
export function followPeaks(
  pencil: Pencil,
  known: readonly number[],
  band: Band,
  accuracy: number,
): readonly Peak[] | null {
  const closeEnough = Math.min(farthest, Math.sqrt(accuracy / leftOver));
  const peaks: Peak[] = [];
  for (const omega of known) {
    const peak = followPeak(pencil, omega, band, closeEnough);
    if (peak === null || peaks.some((other) => Math.abs(other.omega - peak.omega) <= merged * peak.omega))
      return null;
    peaks.push(peak);
  }
  return peaks;
}

function followPeak(pencil: Pencil, known: number, band: Band, closeEnough: number): Peak | null {
  let omega = known;
  let last: { readonly omega: number; readonly shift: number } | undefined;
  for (let step = 0; step < mostSteps && omega > 0 && inBand(band, omega); step++) {
    const gain = channelGain(pencil, pencil.factor(0, omega));
    const { re, im } = slope(pencil, gain);
    const size = re * re + im * im;
    // λ − iω = σ/h′.
    const width = (-gain.sigma * re) / size;
    const shift = (-gain.sigma * im) / size;
    if (!(width > 0 && width < wellDamped * omega) || !gain.settled) return null;
    const distance = shift / width;
    if (Math.abs(distance) <= closeEnough) {
      return { omega: omega + shift, sigma: gain.sigma * Math.hypot(1, distance) };
    }
    const next = omega + (last === undefined ? 1 : secant(omega, shift, last)) * shift;
    last = { omega, shift };
    omega = next;
  }
  return null;
}

/** How much further than the pole the peak is: other poles tilt the way there, which the last step tells. */
function secant(
  omega: number,
  shift: number,
  last: { readonly omega: number; readonly shift: number },
): number {
  const factor = (omega - last.omega) / (last.shift - shift);
  return factor > 0.5 && factor < 2 ? factor : 1;
}

/** h′ = uᴴ H′(iω) v, a number; P′ = 2sM + C, and B′ is B in its damping-like columns, zero elsewhere. */
function slope(pencil: Pencil, { sRe, sIm, v, x, y }: ChannelGain): { re: number; im: number } {
  const carried = innerProduct(y, applyPencilDerivative(pencil, sRe, sIm, x));
  const viscous: ComplexVector = complexVector(v.re.length);
  pencil.powers.forEach((power, k) => {
    if (power === 0) return;
    viscous.re[k] = v.re[k];
    viscous.im[k] = v.im[k];
  });
  const fed = innerProduct(y, applyComplex(pencil.input, viscous));
  return { re: fed.re - carried.re, im: fed.im - carried.im };
}
