import { quadraticEigen } from "../numerics/dense/quadratic-eigen.js";
import { inBand } from "./band.js";
import type { Measure } from "./measure.js";
import { checkEigenvalue, dampingRatio, selectEigenvalues, upperHalf } from "./stability.js";

export type DecayKind = "rate" | "ratio" | "logDecrement";

/**
 * Decay of one eigenvalue: rate −Re s [1/s], damping ratio ζ, or logarithmic decrement
 * δ = 2πζ/√(1 − ζ²), infinite for an eigenvalue that does not oscillate.
 */
export function decayOf(kind: DecayKind, re: number, im: number): number {
  if (kind === "rate") return -re;
  const ratio = dampingRatio(re, im);
  if (kind === "ratio") return ratio;
  return im === 0 ? Math.sign(-re) * Number.POSITIVE_INFINITY : (2 * Math.PI * -re) / Math.abs(im);
}

/** The least damped eigenvalue in the band, by the chosen kind of decay. */
export function decay(kind: DecayKind): Measure {
  return {
    name: "decay",
    estimate: (pencilAt, setting) => {
      const { massMatrix, velocityMatrix, displacementMatrix } = pencilAt(1);
      const eigen = quadraticEigen(massMatrix, velocityMatrix, displacementMatrix, setting.shift);
      const all = selectEigenvalues(
        eigen,
        () => eigen,
        (re, im) => inBand(setting.band, im) && Number.isFinite(decayOf(kind, re, im)),
        (re, im) => decayOf(kind, re, im),
      );
      const value = all[0]?.value ?? Number.POSITIVE_INFINITY;
      const near = value + 0.3 * Math.abs(value);
      const criticals = all.filter((critical) => critical.value <= near).slice(0, 6);
      return { value, criticals, eigenvalues: upperHalf(eigen) };
    },
    check: (pencilAt, critical, lift, setting) =>
      checkEigenvalue(pencilAt(1), critical, lift, setting.shift, (re, im) => decayOf(kind, re, im)),
  };
}
