import { basename } from "node:path";
import { invariant } from "../errors.js";
import { type ProblemDocument, readDocument } from "./document.js";
import { FaultList } from "./fault-list.js";
import { checkDof } from "./inline-matrix.js";
import { pointerSegment } from "./json-text.js";
import { readMargin } from "./margin-settings.js";
import { readMatrices } from "./matrices.js";
import { MatrixFiles } from "./matrix-files.js";
import { isObjectWord, type Parameters, readFormula, readParameters } from "./parameters.js";
import { readPerturbations } from "./perturbations.js";
import type { Limit, Problem } from "./problem.js";
import { readTerms } from "./terms.js";

/**
 * Reads a problem file and the matrix files it names, and checks everything that can be told without
 * assembling the model.
 *
 * @throws InputError with all faults of the problem file and the first of each matrix file.
 */
export async function readProblem(path: string): Promise<Problem> {
  const faults = new FaultList(path);
  const document = await readDocument(path, faults);
  const { content, input } = document;
  const files = new MatrixFiles(path, faults);
  const matrices = await readMatrices(document, files, faults);
  const parameters = readParameters(document, faults);
  const fixed = readFixed(document, matrices.dofs, faults);
  const terms = readTerms(document, matrices, parameters, faults);
  const perturbations = readPerturbations(document, matrices, parameters, faults);
  const budget = readBudget(document, parameters, faults);
  const free = matrices.dofs === null ? null : matrices.dofs - fixed.length;
  const margin = readMargin(document, free, faults);
  faults.throwIfAny();
  invariant(matrices.dofs !== null, "missing dofs are a fault");
  return {
    title: content.title ?? basename(path, ".json"),
    notes: content.notes ?? null,
    path,
    dofs: matrices.dofs,
    fixed,
    matrices: matrices.sound,
    terms,
    constants: parameters.constants,
    design: parameters.design,
    envelope: parameters.envelope,
    perturbations,
    margin,
    budget,
    tune: { seed: content.tune?.seed ?? 1, tolerance: content.tune?.tolerance ?? 1e-3 },
    inputs: [input, ...files.inputs],
  };
}

function readFixed({ content }: ProblemDocument, dofs: number | null, faults: FaultList): Int32Array {
  const fixed = content.fixed ?? [];
  const seen = new Set<number>();
  fixed.forEach((dof, k) => {
    if (dofs !== null) checkDof(dof, dofs, `/fixed/${k}`, faults);
    if (seen.has(dof))
      faults.add("input.fixed", `/fixed/${k}`, `dof ${dof} is fixed twice`, "Name each dof once.");
    seen.add(dof);
  });
  if (dofs !== null && seen.size >= dofs) {
    faults.add("input.fixed", "/fixed", `all ${dofs} dofs are fixed`, "Leave at least one dof free.");
  }
  return Int32Array.from(seen, (dof) => dof - 1).sort();
}

function readBudget({ content }: ProblemDocument, parameters: Parameters, faults: FaultList): Limit[] {
  const operating = new Set(parameters.envelope.map(({ name }) => name));
  return Object.entries(content.budget ?? {}).flatMap(([name, { formula: written, limit, unit }]) => {
    const at = `/budget${pointerSegment(name)}`;
    if (isObjectWord(name)) {
      faults.add("input.name", at, `"${name}" cannot be a name: it has a meaning of its own`, "Rename it.");
    }
    const formula = readFormula(written, `${at}/formula`, parameters, faults);
    const refused = formula?.names.filter((used) => operating.has(used)) ?? [];
    for (const used of refused) {
      const message = `"${used}" is an operating parameter; a budget depends on the design and constants only`;
      faults.add("input.formula-name", `${at}/formula`, message, `Replace "${used}" by a constant.`);
    }
    return formula === null ? [] : [{ name, formula, limit, unit: unit ?? "" }];
  });
}
