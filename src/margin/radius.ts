import { type Pencil, withFactor } from "../model/pencil.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import { type QuadraticEigen, quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import type { DensePencil } from "../reduction/reduced-model.js";
import { channelGain } from "./channel-gain.js";
import {
  type Checked,
  type Critical,
  type Estimate,
  type Measure,
  realDirections,
  type Setting,
} from "./measure.js";
import { findPeaks, growsWithoutBound } from "./peaks.js";
import { poleOnAxis, spectralForm } from "./spectral-form.js";
import {
  checkEigenvalue,
  eigenvalueCritical,
  isUnstable,
  unstableCriticals,
  upperHalf,
} from "./stability.js";

function estimate(pencilAt: (multiplier: number) => DensePencil, setting: Setting): Estimate {
  const pencil = pencilAt(1);
  const form = spectralForm(pencil, setting.shift);
  const vectors = vectorsOf(pencil, setting.shift);
  const eigenvalues = upperHalf(form.poles);
  const unstable = unstableCriticals(form.poles, vectors, setting);
  if (unstable.length > 0) return { value: unstable[0].value, criticals: unstable, eigenvalues };
  const undamped = poleOnAxis(form, pencil, setting.band);
  if (undamped >= 0) {
    const critical = eigenvalueCritical(form.poles, vectors, undamped, 0);
    return { value: 0, criticals: [critical], eigenvalues };
  }
  const criticals = findPeaks(form, setting.band, setting.peaks)
    .filter((peak) => peak.sigma > 0)
    .map(({ omega, sigma }) => ({ kind: "peak" as const, value: 1 / sigma, omega, sigma }));
  return { value: criticals[0]?.value ?? Number.POSITIVE_INFINITY, criticals, eigenvalues };
}

/** The decomposition of a pencil, made once when first asked for. */
function vectorsOf(pencil: DensePencil, shift: number): () => QuadraticEigen {
  let eigen: QuadraticEigen | undefined;
  return () => {
    const { massMatrix, velocityMatrix, displacementMatrix } = pencil;
    eigen ??= quadraticEigen(massMatrix, velocityMatrix, displacementMatrix, shift);
    return eigen;
  };
}

/** Backward error of a solve from which on its gain is not believed. */
const worstBackwardError = 1e-8;

function check(
  pencilAt: (multiplier: number) => Pencil,
  critical: Critical,
  lift: (reduced: ComplexVector) => ComplexVector,
  setting: Setting,
): Checked {
  const pencil = pencilAt(1);
  if (critical.kind !== "peak")
    return checkEigenvalue(pencil, critical, lift, setting.shift, (re, im) => {
      if (isUnstable(re, im, setting.shift)) return -re / setting.omegaRef;
      // Left of the axis the reduced model is refuted: no limit here.
      return critical.value === 0 && !isUnstable(-re, im, setting.shift) ? 0 : Number.POSITIVE_INFINITY;
    });
  const gainAt = (omega: number) => withFactor(pencil, 0, omega, (factor) => channelGain(pencil, factor));
  const gain = gainAt(critical.omega);
  const unbounded =
    critical.sigma === Number.POSITIVE_INFINITY &&
    growsWithoutBound((omega) => gainAt(omega).sigma, critical.omega, gain.sigma);
  return {
    value: unbounded ? 0 : 1 / gain.sigma,
    omega: critical.omega,
    error: gain.backwardError,
    converged: gain.settled && Number.isFinite(gain.sigma) && gain.backwardError < worstBackwardError,
    directions: realDirections(gain.x, gain.y),
    found: { kind: "peak", gain },
  };
}

/**
 * Complex stability radius r = 1 / sup_ω σ_max(H(iω)) of the stacked block, 0 where an undamped mode that B and C
 * see lies on the axis or the gain grows without bound; where the model is unstable in the band, minus its growth −max Re s / ω_ref, which a search can climb through zero.
 *
 * Source: Hinrichsen & Pritchard, Systems & Control Letters 7 and 8 (1986).
 */
export const radius: Measure = { name: "radius", estimate, check };
