/**
 * The machine's own BLAS for large products inside fronts, where somebody has installed both the
 * foreign-function package and an OpenBLAS. Never required, and used only when asked for: the
 * results then depend on a library that this program does not carry.
 */

import { createRequire } from "node:module";

/** What the kernels import from outside; addresses are bytes of the kernel's memory. */
export interface OutsideProducts {
  complexProductOutside(...args: ComplexProductArguments): void;
  realProductOutside(...args: RealProductArguments): void;
}

type ComplexProductArguments = [
  cRe: number,
  cIm: number,
  cStride: number,
  aRe: number,
  aIm: number,
  aStride: number,
  bRe: number,
  bIm: number,
  bStride: number,
  m: number,
  n: number,
  k: number,
];

type RealProductArguments = [
  c: number,
  cStride: number,
  a: number,
  aStride: number,
  b: number,
  bStride: number,
  m: number,
  n: number,
  k: number,
];

/** Products with fewer rows or columns than this are quicker inside. */
export const OUTSIDE_FROM = 64;

/** Stands where no library is connected; the kernels then never call it. */
export const nothingOutside: OutsideProducts = {
  complexProductOutside: () => undefined,
  realProductOutside: () => undefined,
};

type Product = (
  layout: number,
  transA: number,
  transB: number,
  m: number,
  n: number,
  k: number,
  alpha: number,
  a: Float64Array,
  lda: number,
  b: Float64Array,
  ldb: number,
  beta: number,
  c: Float64Array,
  ldc: number,
) => void;

/** The part of the foreign-function package that is used. */
interface ForeignFunctions {
  load(library: string): { func(declaration: string): (...args: never[]) => unknown };
}

const LIBRARIES: readonly string[] = [
  "libopenblas.so.0",
  "libopenblas.so",
  "libopenblas.dylib",
  "libopenblas.dll",
];
const GEMM =
  "void cblas_dgemm(int, int, int, int, int, int, double, double *, int, double *, int, double, double *, int)";
const COLUMN_MAJOR = 102;
const PLAIN = 111;

/** The machine's library with its own name for itself, null when either part is missing. */
export function hostBlas(): { readonly name: string; readonly product: Product } | null {
  try {
    const foreign = createRequire(import.meta.url)("koffi") as ForeignFunctions;
    return firstLibrary(foreign);
  } catch {
    return null;
  }
}

function firstLibrary(foreign: ForeignFunctions): ReturnType<typeof hostBlas> {
  for (const library of LIBRARIES) {
    try {
      const blas = foreign.load(library);
      const setThreads = blas.func("void openblas_set_num_threads(int)") as (threads: number) => void;
      const describe = blas.func("const char *openblas_get_config()") as () => string;
      // Threads of our own share the cores; and one thread always adds in the same order.
      setThreads(1);
      return { name: describe().trim(), product: blas.func(GEMM) as Product };
    } catch {
      // The next name, then.
    }
  }
  return null;
}

/**
 * Products in split storage by real ones: C_re −= A_re B_re − A_im B_im, C_im −= A_re B_im + A_im B_re.
 *
 * @param memory - the kernel's memory as it stands at the time of a call.
 */
export function outsideProducts(product: Product, memory: () => ArrayBufferLike): OutsideProducts {
  // Addresses arrive as signed integers.
  const at = (address: number): Float64Array => new Float64Array(memory(), address >>> 0);
  const subtract = (...[c, cStride, a, aStride, b, bStride, m, n, k]: RealProductArguments): void =>
    product(COLUMN_MAJOR, PLAIN, PLAIN, m, n, k, -1, at(a), aStride, at(b), bStride, 1, at(c), cStride);
  const add = (...[c, cStride, a, aStride, b, bStride, m, n, k]: RealProductArguments): void =>
    product(COLUMN_MAJOR, PLAIN, PLAIN, m, n, k, 1, at(a), aStride, at(b), bStride, 1, at(c), cStride);
  return {
    realProductOutside: subtract,
    complexProductOutside: (cRe, cIm, cStride, aRe, aIm, aStride, bRe, bIm, bStride, m, n, k) => {
      subtract(cRe, cStride, aRe, aStride, bRe, bStride, m, n, k);
      add(cRe, cStride, aIm, aStride, bIm, bStride, m, n, k);
      subtract(cIm, cStride, aRe, aStride, bIm, bStride, m, n, k);
      subtract(cIm, cStride, aIm, aStride, bRe, bStride, m, n, k);
    },
  };
}
