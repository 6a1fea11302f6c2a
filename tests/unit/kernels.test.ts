import { afterEach, describe, expect, it, vi } from "vitest";
import { NumericalError } from "../../src/errors.js";
import { hostBlas } from "../../src/numerics/kernels/host-blas.js";
import {
  chosenKernel,
  KERNEL_NAMES,
  KERNEL_VARIABLE,
  type KernelName,
  startKernel,
} from "../../src/numerics/kernels/kernel.js";
import { Workspace, withWorkspace } from "../../src/numerics/kernels/workspace.js";
import { createRandom } from "../../src/numerics/random.js";

const asked = process.env[KERNEL_VARIABLE];

afterEach(() => {
  if (asked === undefined) delete process.env[KERNEL_VARIABLE];
  else process.env[KERNEL_VARIABLE] = asked;
});

describe("the choice of a kernel", () => {
  it("follows the environment variable and otherwise takes a build with vectors on this machine", () => {
    for (const name of KERNEL_NAMES) {
      process.env[KERNEL_VARIABLE] = name;
      expect(chosenKernel()).toBe(name);
    }
    process.env[KERNEL_VARIABLE] = "";
    expect(["fma", "simd"]).toContain(chosenKernel());
  });

  it("refuses a name that it does not know and lists those that it does", () => {
    process.env[KERNEL_VARIABLE] = "abacus";
    expect(() => chosenKernel()).toThrow(/DAMPWRIGHT_KERNEL.*"abacus"/);
    expect(() => chosenKernel()).toThrow(/fma, simd, plain, blas/);
  });

  it("names what is missing when the machine's own library is asked for in vain", () => {
    if (hostBlas() === null) expect(() => startKernel("blas")).toThrow(/OpenBLAS.*koffi/);
    else expect(startKernel("blas").name).toBe("blas");
  });

  it("falls back to JavaScript where WebAssembly is switched off", async () => {
    vi.stubGlobal("WebAssembly", undefined);
    vi.resetModules();
    const fresh = await import("../../src/numerics/kernels/kernel.js");
    expect(fresh.chosenKernel()).toBe("plain");
    expect(fresh.startKernel("plain").functions.firstFree()).toBeGreaterThan(0);
    expect(() => fresh.startKernel("simd")).toThrow(/refuses the kernel "simd"/);
    vi.unstubAllGlobals();
  });
});

describe("a machine with little address space", () => {
  it("is told what to do instead, and the build without WebAssembly starts", () => {
    class Refusing {
      constructor() {
        throw new RangeError("could not allocate memory");
      }
    }
    vi.stubGlobal(
      "WebAssembly",
      new Proxy(WebAssembly, { get: (all, name) => (name === "Memory" ? Refusing : Reflect.get(all, name)) }),
    );
    expect(() => startKernel("simd")).toThrow(NumericalError);
    expect(() => startKernel("simd")).toThrow(/address space/);
    expect(startKernel("plain").name).toBe("plain");
    vi.unstubAllGlobals();
  });
});

describe("the workspace", () => {
  it("grows without losing what it holds", () => {
    for (const name of KERNEL_NAMES) {
      const workspace = new Workspace(name);
      const place = workspace.begin / 8;
      workspace.doubles[place] = Math.PI;
      const before = workspace.bytes;
      workspace.ensure(before + 1);
      expect(workspace.bytes).toBeGreaterThan(before);
      expect(workspace.doubles.length).toBe(workspace.bytes / 8);
      expect(workspace.doubles[place]).toBe(Math.PI);
    }
  });

  it("refuses what no memory of its kind can address", () => {
    for (const name of KERNEL_NAMES) {
      expect(() => new Workspace(name).ensure(2 ** 32 + 1)).toThrow(NumericalError);
    }
  });

  it("serves one piece of work at a time and is free again after a failure", () => {
    expect(() => withWorkspace(() => withWorkspace(() => 0))).toThrow(/in use/);
    expect(withWorkspace(() => 1)).toBe(1);
  });
});

describe("products with more rows, columns and depth than one pass packs", () => {
  const m = 151;
  const n = 1031;
  const k = 133;

  it("agree between all builds to rounding", () => {
    const [fma, simd, plain] = KERNEL_NAMES.map((name) => product(name, false));
    // 133 products of numbers below 1 in another order: a few eps times their sum.
    const bound = 4 * Number.EPSILON * k;
    for (const other of [fma!, simd!]) {
      for (let i = 0; i < plain!.length; i++) {
        if (Math.abs(other[i]! - plain![i]!) > bound) expect.fail(`entry ${i}: ${other[i]} and ${plain![i]}`);
      }
    }
    expect(Math.abs(plain![m * n - 1]!)).toBeGreaterThan(0);
  });

  it("equal the sum of products, also for the adjoint", () => {
    for (const adjoint of [false, true]) {
      const c = product("simd", adjoint);
      const { a, b } = operands();
      for (const [i, j] of [
        [0, 0],
        [m - 1, n - 1],
        [64, 512],
        [77, 513],
      ] as const) {
        let re = 0;
        let im = 0;
        for (let p = 0; p < k; p++) {
          const at = adjoint ? p + i * k : i + p * m;
          const ar = a[at]!;
          const ai = adjoint ? -a[m * k + at]! : a[m * k + at]!;
          const br = b[p + j * k]!;
          const bi = b[n * k + p + j * k]!;
          re -= ar * br - ai * bi;
          im -= ar * bi + ai * br;
        }
        expect(c[i + j * m]).toBeCloseTo(re, 12);
        expect(c[m * n + i + j * m]).toBeCloseTo(im, 12);
      }
    }
  });

  function operands() {
    const random = createRandom(7);
    const fill = (size: number) => Float64Array.from({ length: size }, () => 2 * random.uniform() - 1);
    return { a: fill(2 * m * k), b: fill(2 * n * k) };
  }

  /** 0 − op(A) B, real parts first. */
  function product(name: KernelName, adjoint: boolean): Float64Array {
    const workspace = new Workspace(name);
    const { a, b } = operands();
    const aAt = workspace.begin;
    const bAt = aAt + 8 * a.length;
    const cAt = bAt + 8 * b.length;
    workspace.ensure(cAt + 16 * m * n);
    workspace.doubles.set(a, aAt / 8);
    workspace.doubles.set(b, bAt / 8);
    workspace.doubles.fill(0, cAt / 8, cAt / 8 + 2 * m * n);
    workspace.kernel.subtractComplex(
      cAt,
      cAt + 8 * m * n,
      m,
      aAt,
      aAt + 8 * m * k,
      adjoint ? k : m,
      bAt,
      bAt + 8 * n * k,
      k,
      m,
      n,
      k,
      adjoint ? 1 : 0,
    );
    return workspace.doubles.slice(cAt / 8, cAt / 8 + 2 * m * n);
  }
});
