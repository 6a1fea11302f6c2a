import type { ProblemDocument } from "./document.js";
import type { FaultList } from "./fault-list.js";
import { suggest } from "./nearest.js";
import type { MarginSettings } from "./problem.js";

/** Largest number of free dofs that is judged at all frequencies. */
const mostWithoutBand = 2000;

/** Reads the margin block, fills in its defaults, and checks that the model has what the measure needs. */
export function readMargin(
  document: ProblemDocument,
  freeDofs: number | null,
  faults: FaultList,
): MarginSettings {
  const { content, spoilt } = document;
  const written = content.margin ?? {};
  const perturbed = (content.perturbations ?? []).length > 0;
  const fed = [content.terms?.circulatory, content.terms?.frictional].some(
    (group) => (group ?? []).length > 0,
  );
  const measure = written.measure ?? (perturbed ? "radius" : fed ? "multiplier" : "decay");
  if (measure === "radius" && !perturbed && !spoilt.has("perturbations")) {
    const message = "a radius needs at least one perturbation";
    faults.add("input.measure", "/margin/measure", message, 'Add a block under "perturbations".');
  }
  if (measure === "multiplier" && !fed && written.terms === undefined && !spoilt.has("terms")) {
    const message = "a multiplier needs circulatory or frictional terms, or names under margin.terms";
    faults.add("input.measure", "/margin/measure", message, 'Use "decay", or add the feeding terms.');
  }
  checkTermNames(written.terms ?? [], document, faults);
  checkBand(written.bandHz, document, freeDofs, faults);
  return {
    measure,
    as: written.as ?? "ratio",
    terms: written.terms ?? null,
    bandHz: written.bandHz ?? null,
    target: written.target ?? null,
  };
}

/** Every name under margin.terms must mean exactly one term. */
function checkTermNames(
  names: readonly string[],
  { content, spoilt }: ProblemDocument,
  faults: FaultList,
): void {
  const all = Object.values(content.terms ?? {})
    .flat()
    .flatMap((term) => (term === null ? [] : [term.name ?? term.matrix]));
  names.forEach((name, k) => {
    const at = `/margin/terms/${k}`;
    const count = all.filter((each) => each === name).length;
    if (count === 0 && !spoilt.has("terms")) {
      faults.add("input.unknown-term", at, `no term is called "${name}"`, suggest(name, all, "term"));
    }
    if (count > 1) {
      const message = `${count} terms are called "${name}"`;
      faults.add("input.ambiguous-term", at, message, 'Tell them apart by a "name" in each.');
    }
    if (names.indexOf(name) < k)
      faults.add("input.duplicate-name", at, `"${name}" stands twice`, "Name it once.");
  });
}

function checkBand(
  band: readonly [number, number] | undefined,
  { spoilt }: ProblemDocument,
  freeDofs: number | null,
  faults: FaultList,
): void {
  if (band !== undefined && band[0] >= band[1]) {
    const message = `the lower end ${band[0]} Hz is not below the upper end ${band[1]} Hz`;
    faults.add("input.range", "/margin/bandHz", message, "Write the band as [lowest, highest].");
  }
  if (band !== undefined || spoilt.has("margin") || spoilt.has("fixed") || spoilt.has("dofs")) return;
  if (freeDofs === null || freeDofs <= mostWithoutBand) return;
  const message = `a model of ${freeDofs} free dofs needs a band of frequencies; up to ${mostWithoutBand} do not`;
  faults.add("input.band-missing", "/margin", message, 'Add "bandHz": [lowest, highest] under margin.');
}
