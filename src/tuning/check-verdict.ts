import { type Findings, symmetricGroups } from "./check-findings.js";

/** Why the model is not sound. */
export function doubtsOf({ definiteness, structure }: Findings): string[] {
  const doubts: string[] = [];
  for (const group of ["mass", "damping"] as const) {
    const { verdict, negative, at } = definiteness[group];
    if (verdict !== "indefinite") continue;
    const remedy =
      group === "mass"
        ? "Look for a negative factor or a wrong sign in an exported matrix."
        : "Damping that feeds energy belongs under frictional.";
    doubts.push(
      `The ${group} matrix is indefinite: ${negative} negative eigenvalues at ${describedPoint(at)}. ${remedy}`,
    );
  }
  if (!structure.regular) {
    const dofs = structure.undeterminedDofs.join(", ");
    doubts.push(
      `At ${describedPoint(structure.singularAt)} the model is singular at every frequency: nothing determines the motion of dofs such as ${dofs}. Fix them, or give them mass, a spring or a dashpot.`,
    );
  }
  return doubts;
}

export function warningsOf({ definiteness, structure, undamped }: Findings): string[] {
  const warnings: string[] = [];
  const { stiffness } = definiteness;
  if (stiffness.verdict === "indefinite") {
    warnings.push(
      `The stiffness matrix is indefinite: ${stiffness.negative} negative eigenvalues at ${describedPoint(stiffness.at)}. The guarantee that the model without feeding terms is stable is withdrawn.`,
    );
  }
  for (const group of symmetricGroups) {
    if (definiteness[group].proved) continue;
    warnings.push(
      `The definiteness of ${group} is not proved everywhere: an eigenvalue lies at the tolerance itself.`,
    );
  }
  if (structure.regular && structure.index === "higher") {
    warnings.push(
      "The model has hidden constraints (index above 1), as from Lagrange multipliers; eliminate them where possible.",
    );
  }
  if (undamped.count !== null && undamped.count > 0) {
    const listed = undamped.omega.slice(0, 5).map((omega) => (omega / (2 * Math.PI)).toPrecision(4));
    const lowest = listed.length === 0 ? "" : `, the lowest at ${listed.join(", ")} Hz`;
    warnings.push(
      `${undamped.count} modes that no damping reaches stay on the axis${lowest}. State some background damping.`,
    );
  }
  return warnings;
}

/** Values as a reader would write them. */
export function describedPoint(
  at: Iterable<readonly [string, number]> | Readonly<Record<string, number>> | null,
): string {
  const entries = at === null ? [] : Symbol.iterator in at ? [...at] : Object.entries(at);
  if (entries.length === 0) return "the values of the file";
  return entries.map(([name, value]) => `${name} = ${Number(value.toPrecision(6))}`).join(", ");
}
