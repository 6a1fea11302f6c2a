import type { WorstVector } from "../tuning/commands.js";

const batch = 4096;

/**
 * The worst vector as comma-separated text, one line a dof: its number in the problem file, real and imaginary
 * part, modulus. In pieces, so that a large model needs no string of its size.
 */
export function* vectorsCsv({ dofs, re, im }: WorstVector): Generator<string> {
  yield "dof,re,im,modulus\n";
  for (let from = 0; from < dofs.length; from += batch) {
    let text = "";
    for (let k = from; k < Math.min(from + batch, dofs.length); k++) {
      text += `${dofs[k]},${re[k]},${im[k]},${Math.hypot(re[k], im[k])}\n`;
    }
    yield text;
  }
}
