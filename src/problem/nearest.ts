/** The candidate that `name` was probably meant to be: at most a third of its letters wrong, or cut short. */
export function nearest(name: string, candidates: Iterable<string>): string | undefined {
  const wanted = name.toLowerCase();
  const ranked = [...candidates]
    .map((candidate) => ({ candidate, wrong: distance(wanted, candidate.toLowerCase()) }))
    .filter(({ candidate, wrong }) => {
      const isCut = wanted.length >= 3 && candidate.toLowerCase().startsWith(wanted);
      return isCut || wrong <= Math.max(1, Math.floor(Math.max(name.length, candidate.length) / 3));
    })
    .sort((a, b) => a.wrong - b.wrong);
  return ranked[0]?.candidate;
}

/** A hint for a name that is not known: the nearest candidate, else all of them. */
export function suggest(name: string, candidates: Iterable<string>, what: string): string {
  const known = [...candidates];
  const near = nearest(name, known);
  if (near !== undefined && near !== name) return `Did you mean "${near}"?`;
  if (known.length === 0) return `There is no ${what} yet: declare one.`;
  const shown = known.slice(0, 12).join(", ");
  return `Use one of: ${shown}${known.length > 12 ? ", …" : ""}.`;
}

/** Insertions, deletions and replacements that turn a into b. Source: Levenshtein, Sov. Phys. Dokl. 10 (1966). */
function distance(a: string, b: string): number {
  let previous = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const current = [i];
    for (let j = 1; j <= b.length; j++) {
      const replaced = previous[j - 1] + (a[i - 1] === b[j - 1] ? 0 : 1);
      current.push(Math.min(replaced, previous[j] + 1, current[j - 1] + 1));
    }
    previous = current;
  }
  return previous[b.length];
}
