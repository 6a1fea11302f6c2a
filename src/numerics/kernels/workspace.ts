/**
 * The memory that the kernels work in: one per thread, handed to one factorisation or solve at
 * a time. It grows on demand and is given back after unusually large work.
 */

import { invariant, NumericalError } from "../../errors.js";
import {
  chosenKernel,
  type KernelFunctions,
  type KernelName,
  type StartedKernel,
  startKernel,
} from "./kernel.js";

const PAGE = 65_536;
/** Growth steps; each renews the views, none copies. */
const STEP_PAGES = 256;
/** A larger memory is not kept between two pieces of work. */
const KEPT_BYTES = 2 ** 29;

export class Workspace {
  readonly kernel: KernelFunctions;
  readonly kernelName: KernelName;
  /** The whole memory as doubles and as 32-bit integers; renewed by `ensure`. */
  doubles: Float64Array;
  integers: Int32Array;
  /** First byte that is free, divisible by 16. */
  readonly begin: number;
  private readonly started: StartedKernel;

  constructor(name: KernelName) {
    this.started = startKernel(name);
    this.kernel = this.started.functions;
    this.kernelName = name;
    this.begin = (this.kernel.firstFree() + 15) & ~15;
    this.doubles = new Float64Array(this.started.memory.buffer);
    this.integers = new Int32Array(this.started.memory.buffer);
  }

  get bytes(): number {
    return this.started.memory.buffer.byteLength;
  }

  /**
   * Room up to this byte.
   * @throws NumericalError `numerics.too-large` beyond what the memory can address.
   */
  ensure(end: number): void {
    const { memory, mostPages } = this.started;
    if (end <= memory.buffer.byteLength) return;
    const pages = memory.buffer.byteLength / PAGE;
    const needed = Math.ceil(end / PAGE);
    const target = Math.min(mostPages, Math.max(needed, pages + Math.max(STEP_PAGES, pages >> 2)));
    if (needed > mostPages || !this.grow(target - pages)) {
      throw new NumericalError(
        "numerics.too-large",
        `a factorisation needs ${(end / 2 ** 30).toFixed(1)} GiB for its fronts, beyond ${(mostPages * PAGE) / 2 ** 30} GiB or the free memory`,
        "Use a coarser or smaller model, or free memory.",
      );
    }
  }

  private grow(pages: number): boolean {
    const { memory } = this.started;
    try {
      if (memory.grow(pages) < 0) return false;
    } catch (error) {
      if (error instanceof RangeError) return false;
      throw error;
    }
    this.doubles = new Float64Array(memory.buffer);
    this.integers = new Int32Array(memory.buffer);
    return true;
  }
}

let kernelName: KernelName | undefined;
let idle: Workspace | undefined;
let isBusy = false;

/** Runs one piece of work in this thread's memory. */
export function withWorkspace<Result>(work: (workspace: Workspace) => Result): Result {
  invariant(!isBusy, "withWorkspace: the workspace is in use");
  kernelName ??= chosenKernel();
  const workspace = idle?.kernelName === kernelName ? idle : new Workspace(kernelName);
  isBusy = true;
  try {
    return work(workspace);
  } finally {
    isBusy = false;
    idle = workspace.bytes <= KEPT_BYTES ? workspace : undefined;
  }
}

/** From now on this thread uses this build, or, without a name, the one that the machine prefers. */
export function useKernel(name?: KernelName): void {
  kernelName = name;
}
