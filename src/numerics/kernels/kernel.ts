/**
 * The compiled dense kernels and how one of their builds is chosen.
 *
 * - `fma`: WebAssembly with fused multiply-add (relaxed SIMD),
 * - `simd`: WebAssembly with vectors of two doubles,
 * - `plain`: the same source as JavaScript, for machines without WebAssembly vectors,
 * - `blas`: the best of these, with large products done by an OpenBLAS of the machine.
 *
 * The environment variable `DAMPWRIGHT_KERNEL` forces one; otherwise the first of `fma`, `simd`
 * and `plain` that the machine accepts is taken.
 */

import { readFileSync } from "node:fs";
import { createRequire } from "node:module";
import { setFlagsFromString } from "node:v8";
import { InputError, NumericalError } from "../../errors.js";
import {
  hostBlas,
  nothingOutside,
  OUTSIDE_FROM,
  type OutsideProducts,
  outsideProducts,
} from "./host-blas.js";

export type KernelName = "fma" | "simd" | "plain" | "blas";

/** The builds that need nothing from the machine, best first. */
export const KERNEL_NAMES: readonly KernelName[] = ["fma", "simd", "plain"];
const ALL_NAMES: readonly KernelName[] = [...KERNEL_NAMES, "blas"];

export const KERNEL_VARIABLE = "DAMPWRIGHT_KERNEL";

/**
 * The functions of `assembly/`, which documents them. Addresses are bytes in the memory that
 * the build was started with, sizes and strides doubles; booleans are 0 or 1.
 */
export interface KernelFunctions {
  firstFree(): number;
  clear(at: number, end: number): void;
  setOutsideFrom(size: number): void;
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
  addSquareUpdate(
    target: number,
    stride: number,
    update: number,
    size: number,
    places: number,
    runs: number,
  ): void;
  addLowerUpdate(
    target: number,
    stride: number,
    update: number,
    size: number,
    places: number,
    runs: number,
    crossing: number,
  ): void;
  packSquare(to: number, from: number, stride: number, size: number): void;
  gatherRows(to: number, stride: number, from: number, columns: number, ids: number, count: number): void;
  scatterRows(to: number, columns: number, ids: number, from: number, stride: number, count: number): void;
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

/**
 * Starts this build on a memory of its own.
 * @throws InputError `kernel.refused` when the machine refuses the build; NumericalError
 *   `kernel.no-addresses` when it refuses the memory.
 */
export function startKernel(name: KernelName): StartedKernel {
  if (name === "blas") return startWithBlas();
  if (name === "plain") return startPlain(() => nothingOutside);
  const module = compiled(name);
  if (module === null) throw refusal(name, `Leave ${KERNEL_VARIABLE} unset, or set it to "plain".`);
  return startModule(name, module, () => nothingOutside);
}

/** What a kernel imports, from the memory that it will have. */
type Outside = (memory: () => ArrayBufferLike) => OutsideProducts;

function startModule(name: KernelName, module: WebAssembly.Module, outside: Outside): StartedKernel {
  const memory = reservedMemory();
  const host = outside(() => memory.buffer);
  const instance = new WebAssembly.Instance(module, { env: { memory }, host });
  const functions = instance.exports as unknown as KernelFunctions;
  return { name, functions, memory, mostPages: WASM_PAGES };
}

/** WebAssembly claims all the addresses that a memory may ever have, whatever it uses of them. */
function reservedMemory(): WebAssembly.Memory {
  try {
    return new WebAssembly.Memory({ initial: FIRST_PAGES, maximum: WASM_PAGES });
  } catch (error) {
    if (!(error instanceof RangeError)) throw error;
    throw new NumericalError(
      "kernel.no-addresses",
      "the machine refuses the address space that WebAssembly wants, some 10 GiB for each thread",
      `Raise the limit of virtual memory (ulimit -v), compute with --threads 1, or set ${KERNEL_VARIABLE} to "plain".`,
    );
  }
}

function startPlain(outside: Outside): StartedKernel {
  const instantiate: (imports: object) => KernelFunctions = createRequire(import.meta.url)(
    "./built/kernels.plain.cjs",
  );
  // The build adds `grow` and exchanges the buffer.
  const memory = { buffer: new ArrayBuffer(FIRST_PAGES * PAGE) } as unknown as KernelMemory;
  const functions = instantiate({ env: { memory }, host: outside(() => memory.buffer) });
  return { name: "plain", functions, memory, mostPages: PLAIN_PAGES };
}

function startWithBlas(): StartedKernel {
  const blas = hostBlas();
  if (blas === null) {
    throw refusal("blas", "Install an OpenBLAS and the npm package koffi, or choose another kernel.");
  }
  const outside: Outside = (memory) => outsideProducts(blas.product, memory);
  const module = compiled("fma") ?? compiled("simd");
  const started = module === null ? startPlain(outside) : startModule("blas", module, outside);
  started.functions.setOutsideFrom(OUTSIDE_FROM);
  return { ...started, name: "blas" };
}

function refusal(name: KernelName, hint: string): InputError {
  return InputError.of("kernel.refused", KERNEL_VARIABLE, `this machine refuses the kernel "${name}"`, hint);
}

/** The build to use: the one asked for, or the first that starts. */
export function chosenKernel(): KernelName {
  const asked = process.env[KERNEL_VARIABLE];
  if (asked !== undefined && asked !== "") {
    const name = ALL_NAMES.find((known) => known === asked);
    if (name !== undefined) return name;
    throw InputError.of(
      "kernel.unknown",
      KERNEL_VARIABLE,
      `there is no kernel "${asked}"`,
      `Set it to one of ${ALL_NAMES.join(", ")}, or leave it unset.`,
    );
  }
  if (compiled("fma") !== null) return "fma";
  return compiled("simd") === null ? "plain" : "simd";
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
