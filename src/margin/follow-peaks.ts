import { applyPencilDerivative, type Pencil } from "../model/pencil.js";
import { innerProduct } from "../numerics/dense/complex-vectors.js";
import { type ComplexVector, complexVector } from "../numerics/dense/matrix.js";
import { applyComplex } from "../numerics/real-operator.js";
import { type Band, inBand } from "./band.js";
import { type ChannelGain, channelGain } from "./channel-gain.js";
import type { Peak } from "./polish-peak.js";

/** Factorisations that one peak may take. */
const mostSteps = 5;

/**
 * Distance from a peak, in half widths, up to which the pole tells the height: the correction is its half square, of which
 * the pole has met nine tenths and more; 1e-6 was the most left on the ring brake.
 */
const closeEnough = 0.03;

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
 * @returns the peaks in the order of `known`; null when one left the band, met another or did not settle, or when the pole
 * behind one lies on the axis or right of it. A peak that is not followed goes unseen, and with it an instability that none
 * of those followed shows: for searching only.
 */
export function followPeaks(pencil: Pencil, known: readonly number[], band: Band): readonly Peak[] | null {
  const peaks: Peak[] = [];
  for (const omega of known) {
    const peak = followPeak(pencil, omega, band);
    if (peak === null || peaks.some((other) => Math.abs(other.omega - peak.omega) <= merged * peak.omega))
      return null;
    peaks.push(peak);
  }
  return peaks;
}

function followPeak(pencil: Pencil, known: number, band: Band): Peak | null {
  let omega = known;
  for (let step = 0; step < mostSteps && omega > 0 && inBand(band, omega); step++) {
    const gain = channelGain(pencil, pencil.factor(0, omega));
    const { re, im } = slope(pencil, gain);
    const size = re * re + im * im;
    // λ − iω = σ/h′.
    const width = (-gain.sigma * re) / size;
    const shift = (-gain.sigma * im) / size;
    // A pole further from the axis than from zero makes no peak of its own.
    if (!(width > 0 && width < omega) || !gain.settled) return null;
    const distance = shift / width;
    if (Math.abs(distance) <= closeEnough) {
      return { omega: omega + shift, sigma: gain.sigma * Math.hypot(1, distance) };
    }
    omega += shift;
  }
  return null;
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
