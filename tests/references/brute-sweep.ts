/** The slow way to a complex radius: full solves all over the band, none of them chosen by a reduced model. */

import { FullModel, type FullPencil } from "../../src/fullorder/full-model.js";
import { channelGain } from "../../src/margin/channel-gain.js";
import { nearbyEigenvalues } from "../../src/margin/nearby-eigenvalues.js";
import { buildModel, stateAt } from "../../src/model/parametric-model.js";
import type { Problem } from "../../src/problem/problem.js";

export interface Sweep {
  /** The highest gain met and where [rad/s]. */
  readonly sigma: number;
  readonly omega: number;
  /** Eigenvalues in the band that got a cluster and a polish. */
  readonly eigenvalues: number;
  /** The largest real part among them [1/s]. */
  readonly abscissa: number;
  readonly solves: number;
}

export interface SweepOptions {
  readonly frequencies: number;
  /** Golden sections at every eigenvalue; the highest peak gets as many again, twice over. */
  readonly sections: number;
}

export function bruteSweep(
  problem: Problem,
  values: ReadonlyMap<string, number>,
  { frequencies, sections }: SweepOptions,
): Sweep {
  const model = buildModel(problem);
  const full = new FullModel(model);
  const pencil = full.pencilAt(stateAt(model, values));
  const [low, high] = (problem.margin.bandHz ?? [0, 1]).map((hz) => 2 * Math.PI * hz) as [number, number];
  const eigenvalues = eigenvaluesInBand(pencil, low, high);
  let best = { sigma: 0, omega: low };
  const gain = (omega: number) => {
    const { sigma } = channelGain(pencil, pencil.factor(0, omega));
    if (sigma > best.sigma) best = { sigma, omega };
    return sigma;
  };
  for (let k = 0; k < frequencies; k++) gain(low + (k * (high - low)) / (frequencies - 1));
  for (const { re, im } of eigenvalues) {
    const width = Math.max(Math.abs(re), 1e-6 * im);
    const cluster = [-1, -0.5, 0, 0.5, 1].map((t) => im + t * width).filter((w) => w >= low && w <= high);
    const heights = cluster.map(gain);
    const at = cluster[heights.indexOf(Math.max(...heights))] ?? im;
    goldenSection(gain, Math.max(low, at - 0.5 * width), Math.min(high, at + 0.5 * width), sections);
  }
  const span = Math.max(
    ...eigenvalues.filter(({ im }) => Math.abs(im - best.omega) < 0.01 * im).map(({ re }) => Math.abs(re)),
    1,
  );
  goldenSection(
    gain,
    Math.max(low, best.omega - 0.2 * span),
    Math.min(high, best.omega + 0.2 * span),
    3 * sections,
  );
  return {
    ...best,
    eigenvalues: eigenvalues.length,
    abscissa: Math.max(...eigenvalues.map(({ re }) => re)),
    solves: full.counts.complex,
  };
}

/** Walks along the axis by discs of shift-and-invert Arnoldi on the full model. */
export function eigenvaluesInBand(
  pencil: FullPencil,
  low: number,
  high: number,
): { re: number; im: number }[] {
  const found: { re: number; im: number }[] = [];
  let at = low;
  let stride = 0.01 * (high - low);
  while (at < high) {
    const centre = at + 0.6 * stride;
    const area = nearbyEigenvalues(pencil, pencil.factor(0, centre), high, found.length + 1);
    if (centre - area.radius > at) {
      stride *= 0.5;
      continue;
    }
    for (const { re, im } of area.eigenvalues) {
      const known = found.some((other) => Math.hypot(other.re - re, other.im - im) < 1e-6 * im);
      if (im >= low && im <= high && !known) found.push({ re, im });
    }
    at = centre + 0.7 * area.radius;
    stride = area.radius;
  }
  return found;
}

function goldenSection(f: (x: number) => number, from: number, to: number, steps: number): void {
  const ratio = 0.6180339887498949;
  let [a, b] = [from, to];
  let [x, y] = [b - ratio * (b - a), a + ratio * (b - a)];
  let [fx, fy] = [f(x), f(y)];
  for (let k = 0; k < steps; k++) {
    if (fx > fy) {
      [b, y, fy] = [y, x, fx];
      x = b - ratio * (b - a);
      fx = f(x);
    } else {
      [a, x, fx] = [x, y, fy];
      y = a + ratio * (b - a);
      fy = f(y);
    }
  }
}
