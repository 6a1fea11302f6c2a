import type { ModelState, ParametricModel } from "../model/parametric-model.js";
import type { Pencil } from "../model/pencil.js";
import { innerProduct } from "../numerics/dense/complex-vectors.js";
import type { ComplexVector } from "../numerics/dense/matrix.js";
import { applyComplex, sparseOperator } from "../numerics/real-operator.js";
import type { SparseMatrix } from "../numerics/sparse/sparse-matrix.js";
import type { TermGroup } from "../problem/problem.js";
import { applyInput } from "./channel-gain.js";
import type { Checked } from "./measure.js";

/** Mean power of one term in the worst vector: positive takes energy out, negative feeds it. */
export interface PowerRow {
  readonly name: string;
  readonly group: TermGroup | "model error" | "growth";
  /** Relative to the sum of all positive rows. */
  readonly power: number;
}

export interface PowerBalance {
  readonly rows: readonly PowerRow[];
  /** |sum of the rows|, relative like them: rounding when the balance closes. */
  readonly gap: number;
}

const silent: ReadonlySet<TermGroup> = new Set(["mass", "stiffness", "gyroscopic"]);

/**
 * Where the power goes in the worst vector x at s = σ + iω. Multiplying P(s)x = 0 by (s x)ᴴ gives, row by row,
 *
 *     ½|s|² xᴴDx + ½|s|² Re xᴴFx + ½ Re(s̄ xᴴNx) + ½ Re(s̄ xᴴEx) + ½σ (|s|² xᴴMx + xᴴKx) = 0
 *
 * with E = s^k B Δ C the model error of a radius, and the last row, the growth of the stored energy, only off the axis.
 */
export function powerBalance(
  model: ParametricModel,
  state: ModelState,
  pencil: Pencil,
  checked: Checked,
): PowerBalance {
  const { found } = checked;
  const [sRe, sIm, x] = placeOf(found);
  const size2 = sRe * sRe + sIm * sIm;
  const rows: PowerRow[] = [];
  let growth = 0;
  model.terms.forEach((term, k) => {
    const coefficient = state.coefficients[k];
    if (coefficient === 0) return;
    if (silent.has(term.group) && sRe === 0) return;
    const q = quadraticForm(term.matrix, x);
    const velocity = 0.5 * size2 * coefficient * q.re;
    const displacement = 0.5 * coefficient * (sRe * q.re + sIm * q.im);
    if (term.group === "mass") growth += sRe * velocity;
    else if (term.group === "stiffness") growth += displacement;
    else if (term.group === "circulatory")
      rows.push({ name: term.name, group: term.group, power: displacement });
    else if (term.group !== "gyroscopic") rows.push({ name: term.name, group: term.group, power: velocity });
  });
  if (sRe !== 0) rows.push({ name: "stored energy", group: "growth", power: growth });
  if (found.kind === "peak") {
    const load = innerProduct(x, applyInput(pencil, sRe, sIm, found.gain.v));
    rows.push({
      name: "declared error",
      group: "model error",
      power: -0.5 * (sRe * load.re + sIm * load.im),
    });
  }
  const scale = rows.reduce((sum, row) => sum + Math.max(0, row.power), 0) || 1;
  const relative = rows.map((row) => ({ ...row, power: row.power / scale }));
  return { rows: relative, gap: Math.abs(relative.reduce((sum, row) => sum + row.power, 0)) };
}

function placeOf(found: Checked["found"]): [number, number, ComplexVector] {
  if (found.kind === "peak") return [found.gain.sRe, found.gain.sIm, found.gain.x];
  if (found.kind === "eigenvalue") return [found.pair.re, found.pair.im, found.pair.right];
  return [0, found.crossing.omega, found.crossing.right];
}

/** xᴴ A x. */
function quadraticForm(a: SparseMatrix, x: ComplexVector): { re: number; im: number } {
  return innerProduct(x, applyComplex(sparseOperator(a), x));
}
