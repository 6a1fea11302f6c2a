/** Keeps words on one line until `page` makes it a plain space. */
export const noBreak = "\u00a0";

/**
 * A number as people read it: at most `digits` significant ones, a power of ten only where it is short of
 * 0.001 or a million and more. null, which stands for infinite or absent, is "none".
 */
export function numberText(value: number | null, digits = 4): string {
  if (value === null) return "none";
  const rounded = Number(value.toPrecision(digits));
  const size = Math.abs(rounded);
  const plain = size === 0 || (size >= 1e-3 && size < 1e6) || !Number.isFinite(rounded);
  return plain ? String(rounded) : rounded.toExponential().replace("e+", "e");
}

/** A value beside the target it misses or meets: as many digits as it takes to tell them apart, four at least. */
export function valueBeside(target: number | null, value: number | null): string {
  for (let digits = 4; digits < 12; digits++) {
    const text = numberText(value, digits);
    if (value === target || text !== numberText(target, digits)) return text;
  }
  return numberText(value, 12);
}

/** "friction = 0.55, speed = 10 rad/s"; empty without names. */
export function assignments(
  values: Readonly<Record<string, number>>,
  units: Readonly<Record<string, string>>,
): string {
  return Object.entries(values)
    .map(([name, value]) => `${name}${noBreak}=${noBreak}${withUnit(numberText(value), units[name])}`)
    .join(", ");
}

/** A number and its unit, kept on one line. */
export function withUnit(text: string, unit: string | undefined): string {
  return unit === undefined || unit === "" ? text : `${text}${noBreak}${unit.replaceAll(" ", noBreak)}`;
}

/** "1 mode", "3 modes". */
export function counted(count: number, noun: string): string {
  return `${count} ${noun}${count === 1 ? "" : "s"}`;
}

/** A share of one as a percentage of three digits: "0.0441 %". */
export function percentText(share: number | null): string {
  return share === null ? "none" : withUnit(numberText(100 * share, 3), "%");
}
