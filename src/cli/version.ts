import { readFileSync } from "node:fs";

/** Version of the package, as `package.json` has it. */
export const version: string = String(
  JSON.parse(readFileSync(new URL("../../package.json", import.meta.url), "utf8")).version,
);
