import type { ProblemDocument } from "./document.js";
import type { FaultList } from "./fault-list.js";
import { type Matrices, TermMatrixChecker, termGroups } from "./matrices.js";
import { suggest } from "./nearest.js";
import { type Parameters, readFormula } from "./parameters.js";
import type { Term } from "./problem.js";

/** Reads the terms of the six model matrices and checks their matrices and formulas. */
export function readTerms(
  { content, spoilt }: ProblemDocument,
  matrices: Matrices,
  parameters: Parameters,
  faults: FaultList,
): Term[] {
  const checker = new TermMatrixChecker(matrices, faults);
  const terms = termGroups.flatMap((group) =>
    (content.terms?.[group] ?? []).flatMap((written, k) => {
      if (written === null) return [];
      const pointer = `/terms/${group}/${k}`;
      const factor = readFormula(written.factor ?? 1, `${pointer}/factor`, parameters, faults);
      const validToHz = readValidity(written.validToHz, `${pointer}/validToHz`, parameters, faults);
      const matrix = matrices.sound.get(written.matrix);
      if (matrix !== undefined) checker.check(matrix, group, `${pointer}/matrix`);
      else if (!matrices.declared.includes(written.matrix)) {
        const hint = suggest(written.matrix, matrices.declared, "matrix");
        faults.add(
          "input.unknown-matrix",
          `${pointer}/matrix`,
          `no matrix is called "${written.matrix}"`,
          hint,
        );
      }
      const name = written.name ?? written.matrix;
      return factor === null ? [] : [{ group, matrix: written.matrix, name, factor, validToHz, pointer }];
    }),
  );
  const written = termGroups.some((group) => (content.terms?.[group] ?? []).length > 0);
  if (!written && content.terms !== undefined && !spoilt.has("terms")) {
    faults.add(
      "input.no-terms",
      "/terms",
      "the model has no terms",
      "Add a term under mass and one under stiffness.",
    );
  }
  return terms;
}

/** The highest frequency at which a term's factor holds [Hz]; null when none is given, and after a fault. */
function readValidity(
  written: string | number | undefined,
  at: string,
  parameters: Parameters,
  faults: FaultList,
): number | null {
  if (written === undefined) return null;
  const formula = readFormula(written, at, parameters, faults);
  if (formula === null) return null;
  const { constants } = parameters;
  const varying = formula.names.filter((used) => !constants.has(used) && parameters.values.has(used));
  for (const used of varying) {
    const message = `"${used}" varies; the frequency up to which a factor holds depends on constants only`;
    faults.add("input.formula-name", at, message, `Replace "${used}" by a constant.`);
  }
  if (!formula.names.every((used) => constants.has(used))) return null;
  const hz = formula.evaluate(constants);
  if (hz > 0) return hz;
  const message = `the frequency up to which the factor holds is ${hz} Hz; expected more than 0`;
  faults.add("input.value", at, message, "Correct it, or leave it out where the factor always holds.");
  return null;
}
