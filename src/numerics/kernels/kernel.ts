/**
 * The compiled dense kernels and how one of their builds is chosen.
 *
 * - `fma`: WebAssembly with fused multiply-add (relaxed SIMD),
 * - `simd`: WebAssembly with vectors of two doubles,
 * - `plain`: the same source as JavaScript, for machines without WebAssembly vectors.
 *
 * The environment variable `DAMPWRIGHT_KERNEL` forces one; otherwise the first that the
 * machine accepts is taken.
 */

import { readFileSync } from "node:fs";
import { createRequire } from "node:module";
import { setFlagsFromString } from "node:v8";
import { InputError } from "../../errors.js";

export type KernelName = "fma" | "simd" | "plain";

export const KERNEL_NAMES: readonly KernelName[] = ["fma", "simd", "plain"];

export const KERNEL_VARIABLE = "DAMPWRIGHT_KERNEL";

/**
 * The functions of `assembly/`, which documents them. Addresses are bytes in the memory that
 * the build was started with, sizes and strides doubles; booleans are 0 or 1.
 */
export interface KernelFunctions {
  firstFree(): number;
  eliminateComplex(
    re: number,
    im: number,
    order: number,
    summed: number,
    rowIds: number,
    colIds: number,
    tiny: number,
    isRoot: number,
  ): number;
  perturbedPivots(): number;
  eliminateSymmetric(
    front: number,
    order: number,
    summed: number,
    ids: number,
    diagonal: number,
    scratch: number,
    tiny: number,
    isRoot: number,
  ): number;
  perturbedSymmetricPivots(): number;
  symmetricScratch(order: number): number;
  addSquareUpdate(target: number, stride: number, update: number, size: number, places: number): void;
  addLowerUpdate(
    target: number,
    stride: number,
    update: number,
    size: number,
    places: number,
    crossing: number,
  ): void;
  packSquare(to: number, from: number, stride: number, size: number): void;
  packRows(to: number, from: number, stride: number, rows: number, columns: number): void;
  packLower(to: number, from: number, stride: number, size: number): void;
  subtractComplex: ComplexProduct;
  solveComplexUnitLower: ComplexSolve;
  solveComplexUnitLowerAdjoint: ComplexSolve;
  solveComplexUpper: ComplexSolve;
  solveComplexUpperAdjoint: ComplexSolve;
  subtractReal(
    y: number,
    yStride: number,
    a: number,
    aStride: number,
    x: number,
    xStride: number,
    m: number,
    n: number,
    k: number,
    transposed: number,
  ): void;
  solveRealUnitLower: RealSolve;
  solveRealUnitLowerTransposed: RealSolve;
}

/** y ← y − op(A) x with op(A) m×k, x k×n; `adjoint` takes Aᴴ of a k×m block. */
export type ComplexProduct = (
  yRe: number,
  yIm: number,
  yStride: number,
  aRe: number,
  aIm: number,
  aStride: number,
  xRe: number,
  xIm: number,
  xStride: number,
  m: number,
  n: number,
  k: number,
  adjoint: number,
) => void;

/** X ← T⁻¹ X or T⁻ᴴ X with T a k×k triangle, X k×n. */
export type ComplexSolve = (
  tRe: number,
  tIm: number,
  tStride: number,
  xRe: number,
  xIm: number,
  xStride: number,
  n: number,
  k: number,
) => void;

/** X ← T⁻¹ X or T⁻ᵀ X with T a k×k unit triangle, X k×n. */
export type RealSolve = (
  t: number,
  tStride: number,
  x: number,
  xStride: number,
  n: number,
  k: number,
) => void;

/** A memory that grows by pages of 64 KiB. */
export interface KernelMemory {
  readonly buffer: ArrayBufferLike;
  grow(pages: number): number;
}

export interface StartedKernel {
  readonly name: KernelName;
  readonly functions: KernelFunctions;
  readonly memory: KernelMemory;
  /** Pages that the memory can have. */
  readonly mostPages: number;
}

const PAGE = 65_536;
const FIRST_PAGES = 64;
const WASM_PAGES = 65_536;
/** JavaScript builds compute addresses as signed 32-bit integers. */
const PLAIN_PAGES = 32_767;

/** Starts this build on a memory of its own. @throws InputError when the machine refuses it. */
export function startKernel(name: KernelName): StartedKernel {
  if (name === "plain") return startPlain();
  const module = compiled(name);
  if (module === null) {
    throw InputError.of(
      "kernel.refused",
      KERNEL_VARIABLE,
      `this machine refuses the kernel "${name}"`,
      `Leave ${KERNEL_VARIABLE} unset, or set it to "plain".`,
    );
  }
  const memory = new WebAssembly.Memory({ initial: FIRST_PAGES, maximum: WASM_PAGES });
  const instance = new WebAssembly.Instance(module, { env: { memory } });
  const functions = instance.exports as unknown as KernelFunctions;
  return { name, functions, memory, mostPages: WASM_PAGES };
}

function startPlain(): StartedKernel {
  const instantiate: (imports: object) => KernelFunctions = createRequire(import.meta.url)(
    "./built/kernels.plain.cjs",
  );
  // The build adds `grow` and exchanges the buffer.
  const memory = { buffer: new ArrayBuffer(FIRST_PAGES * PAGE) } as unknown as KernelMemory;
  const functions = instantiate({ env: { memory } });
  return { name: "plain", functions, memory, mostPages: PLAIN_PAGES };
}

/** The build to use: the one asked for, or the first that starts. */
export function chosenKernel(): KernelName {
  const asked = process.env[KERNEL_VARIABLE];
  if (asked !== undefined && asked !== "") {
    const name = KERNEL_NAMES.find((known) => known === asked);
    if (name !== undefined) return name;
    throw InputError.of(
      "kernel.unknown",
      KERNEL_VARIABLE,
      `there is no kernel "${asked}"`,
      `Set it to one of ${KERNEL_NAMES.join(", ")}, or leave it unset.`,
    );
  }
  return KERNEL_NAMES.find((name) => name === "plain" || compiled(name) !== null) ?? "plain";
}

const modules = new Map<KernelName, WebAssembly.Module | null>();

/** The compiled build, null when the machine refuses it. */
function compiled(name: "fma" | "simd"): WebAssembly.Module | null {
  const known = modules.get(name);
  if (known !== undefined) return known;
  const module = typeof WebAssembly === "undefined" ? null : compile(name);
  modules.set(name, module);
  return module;
}

function compile(name: "fma" | "simd"): WebAssembly.Module | null {
  const code = readFileSync(new URL(`./built/kernels.${name}.wasm`, import.meta.url));
  if (name === "fma" && !WebAssembly.validate(code)) {
    // Node 20 has fused multiply-add behind a flag that may still be set while it runs.
    setFlagsFromString("--experimental-wasm-relaxed-simd");
  }
  return WebAssembly.validate(code) ? new WebAssembly.Module(code) : null;
}
