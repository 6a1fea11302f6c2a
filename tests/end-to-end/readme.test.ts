import { spawnSync } from "node:child_process";
import { mkdirSync, readFileSync, symlinkSync, writeFileSync } from "node:fs";
import { join, resolve } from "node:path";
import { describe, expect, it } from "vitest";
import { newFolder } from "./command-line.js";

const readme = readFileSync("README.md", "utf8");
const [, example] = /```ts\n(.*?)```/s.exec(readme) ?? [];

/** The example as a user of the package has it: a module beside a `node_modules` that holds dampwright. */
function installed(name: string): { readonly folder: string; readonly file: string } {
  const folder = newFolder();
  mkdirSync(join(folder, "node_modules"));
  symlinkSync(resolve("."), join(folder, "node_modules", "dampwright"));
  writeFileSync(join(folder, "package.json"), '{ "type": "module" }');
  const file = join(folder, name);
  writeFileSync(file, example);
  return { folder, file };
}

describe("the library example of the README", () => {
  it("prints what its last line says", () => {
    const [, promised] = /console\.log\([^\n]*\/\/ (.+)\n$/.exec(example) ?? [];
    const { status, stdout, stderr } = spawnSync(process.execPath, [installed("example.js").file], {
      encoding: "utf8",
    });
    expect({ status, stdout }).toEqual({ status: 0, stdout: `${promised}\n` });
    expect(stderr).toContain("gathering evidence");
  });

  it("has the types of the package", () => {
    const { folder, file } = installed("example.ts");
    const flags =
      "--noEmit --strict --skipLibCheck false --module nodenext --target es2022 --lib es2022,dom --types";
    const compiler = resolve("node_modules", "typescript", "bin", "tsc");
    const { stdout } = spawnSync(process.execPath, [compiler, ...flags.split(" "), "", file], {
      encoding: "utf8",
      cwd: folder,
    });
    expect(stdout).toBe("");
  });
});
