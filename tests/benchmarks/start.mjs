/** Compiles the benchmark with the sources it measures (types are for `npm run check`), puts the files beside them that they read, and runs it. */

import { execFileSync } from "node:child_process";
import { cpSync } from "node:fs";
import { createRequire } from "node:module";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";

const here = dirname(fileURLToPath(import.meta.url));
const compiler = join(dirname(createRequire(import.meta.url).resolve("typescript/package.json")), "bin/tsc");
execFileSync(process.execPath, [compiler, "-p", here], { stdio: "inherit" });
for (const path of ["problem/problem.schema.json", "numerics/kernels/built"]) {
  cpSync(join(here, "../../src", path), join(here, "dist/src", path), { recursive: true });
}
await import("./dist/tests/benchmarks/run.js");
