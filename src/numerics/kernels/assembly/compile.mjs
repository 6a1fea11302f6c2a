/**
 * Compiles the kernels into `../built`: with fused multiply-add, with plain vectors, and as
 * JavaScript without vectors. Does nothing when the results are newer than all sources.
 */

import { execFileSync } from "node:child_process";
import {
  copyFileSync,
  existsSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  writeFileSync,
} from "node:fs";
import { createRequire } from "node:module";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";

const sources = dirname(fileURLToPath(import.meta.url));
const target = join(sources, "../built");
const require = createRequire(import.meta.url);
const compiler = join(dirname(require.resolve("assemblyscript/package.json")), "bin/asc.js");
const translator = join(dirname(require.resolve("binaryen/package.json")), "bin/wasm2js");

function run(script, args) {
  execFileSync(process.execPath, [script, ...args], { stdio: ["ignore", "ignore", "inherit"] });
}

/** Compiles a copy of the sources whose lanes are of this type. */
function compile(output, lane, features) {
  const copy = mkdtempSync(join(dirname(output), "sources-"));
  for (const name of readdirSync(sources)) copyFileSync(join(sources, name), join(copy, name));
  writeFileSync(join(copy, "lane.ts"), `export type Lane = ${lane};\n`);
  // Warning 112 is about vectors as arguments across the border, where none appears.
  const options = "-O3 --runtime stub --importMemory --maximumMemory 65536 --noAssert --disableWarning 112";
  run(compiler, [join(copy, "index.ts"), "-o", output, ...features, ...options.split(" ")]);
}

/** The translator writes a module around the function that takes the imports; only the function is wanted. */
function translate(module, output) {
  run(translator, [module, "--enable-bulk-memory", "-O2", "-o", output]);
  const text = readFileSync(output, "utf8");
  const begin = text.indexOf("function asmFunc");
  const end = text.indexOf("var memasmFunc");
  if (begin < 0 || end < begin) throw new Error("the translated kernels do not have the expected shape");
  const helpers = text.slice(0, begin).replace(/^import .*$/gm, "");
  writeFileSync(output, `${helpers}${text.slice(begin, end)}module.exports = asmFunc;\n`);
}

const outputs = ["kernels.fma.wasm", "kernels.simd.wasm", "kernels.plain.cjs"];
const newest = Math.max(...readdirSync(sources).map((name) => statSync(join(sources, name)).mtimeMs));
const isCurrent = (file) => existsSync(file) && statSync(file).mtimeMs >= newest;
if (!outputs.every((name) => isCurrent(join(target, name)))) {
  mkdirSync(target, { recursive: true });
  // Written aside and renamed: several test runs may compile at the same time.
  const aside = mkdtempSync(join(target, "compiling-"));
  try {
    const [fma, simd, plain] = outputs.map((name) => join(aside, name));
    const scalar = join(aside, "kernels.scalar.wasm");
    compile(fma, "v128", ["--enable", "simd", "--enable", "relaxed-simd"]);
    compile(simd, "v128", ["--enable", "simd"]);
    compile(scalar, "f64", ["--disable", "simd"]);
    translate(scalar, plain);
    for (const name of outputs) renameSync(join(aside, name), join(target, name));
  } finally {
    rmSync(aside, { recursive: true });
  }
}
