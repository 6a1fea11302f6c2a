import { afterAll, beforeAll, describe } from "vitest";
import { KERNEL_NAMES } from "../../src/numerics/kernels/kernel.js";
import { useKernel } from "../../src/numerics/kernels/workspace.js";
import { createRandom } from "../../src/numerics/random.js";
import { fromTriplets, type SparseMatrix } from "../../src/numerics/sparse/sparse-matrix.js";

/** Uniform numbers in [0, 1), the same for the same seed. */
export function uniform(seed: number): () => number {
  const random = createRandom(seed);
  return () => random.uniform();
}

/** A structurally symmetric matrix with full diagonal in the pattern; complex parts on one pattern. */
export interface SparseCase {
  readonly name: string;
  readonly a: SparseMatrix;
  readonly im: Float64Array;
}

type Entries = Map<number, [number, number]>;

/** Values for the pairs (i, j) and (j, i), symmetric when asked; zero diagonals stay in the pattern. */
function build(
  name: string,
  n: number,
  edges: readonly (readonly [number, number])[],
  zeroDiagonal: (i: number) => boolean,
  scaleOf: (i: number) => number,
  random: () => number,
  symmetric: boolean,
): SparseCase {
  const entries: Entries = new Map();
  const draw = (): [number, number] => [2 * random() - 1, symmetric ? 0 : 2 * random() - 1];
  for (let i = 0; i < n; i++) entries.set(i + i * n, zeroDiagonal(i) ? [0, 0] : draw());
  for (const [i, j] of edges) {
    if (i === j) continue;
    const value = draw();
    entries.set(i + j * n, value);
    entries.set(j + i * n, symmetric ? value : draw());
  }
  const rows: number[] = [];
  const cols: number[] = [];
  const re: number[] = [];
  const im: number[] = [];
  for (const [key, [x, y]] of entries) {
    const i = key % n;
    const j = Math.floor(key / n);
    rows.push(i);
    cols.push(j);
    re.push(x * scaleOf(i) * scaleOf(j));
    im.push(y * scaleOf(i) * scaleOf(j));
  }
  const a = fromTriplets(n, n, rows, cols, re);
  return { name, a, im: fromTriplets(n, n, rows, cols, im).values };
}

/** The same positions with values multiplied by 10^u, u from −3 to 3; no diagonal is zero any more. */
function uneven(base: SparseCase, random: () => number, symmetric: boolean): SparseCase {
  const { a, im } = base;
  const factorOf = new Map<number, number>();
  const values = a.values.slice();
  const imaginary = im.slice();
  for (let j = 0; j < a.cols; j++) {
    for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) {
      const i = a.rowIndex[p]!;
      const key = symmetric ? Math.min(i, j) + Math.max(i, j) * a.cols : i + j * a.cols;
      const factor = factorOf.get(key) ?? 10 ** (6 * random() - 3);
      factorOf.set(key, factor);
      values[p] = values[p]! * factor + (i === j ? 1e-4 : 0);
      imaginary[p] = imaginary[p]! * factor;
    }
  }
  return { name: base.name, a: { ...a, values }, im: imaginary };
}

/** Awkward structures of order up to 45: chains, constraints, arrows, loose parts, wild scales, zero diagonals. */
export function awkwardCase(seed: number, symmetric: boolean): SparseCase {
  const random = uniform(seed);
  const n = seed % 23 === 0 ? 1 : 2 + Math.floor(random() * 44);
  const pick = (): number => Math.floor(random() * n);
  const some = Array.from({ length: 2 * n }, () => [pick(), pick()] as const);
  const chain = Array.from({ length: n - 1 }, (_, i) => [i, i + 1] as const);
  const one = (): number => 1;
  const never = (): boolean => false;
  const wild = Array.from({ length: n }, () => 10 ** (12 * random() - 6));
  switch (seed % 8) {
    case 0:
      return build("scattered", n, some, never, one, random, symmetric);
    case 1:
      return build("scales 1e-12 to 1e12", n, some, never, (i) => wild[i]!, random, symmetric);
    case 2: {
      // [K Gᵀ; G 0] with fewer constraints than dofs and every constraint on two dofs of its own.
      const free = Math.ceil((2 * n) / 3);
      const constraints = Array.from({ length: n - free }, (_, c) => [free + c, 2 * c] as const);
      const more = Array.from(
        { length: n - free },
        (_, c) => [free + c, Math.min(2 * c + 1, free - 1)] as const,
      );
      const inside = chain.filter(([, j]) => j < free);
      return build(
        "constraints",
        n,
        [...inside, ...constraints, ...more],
        (i) => i >= free,
        one,
        random,
        symmetric,
      );
    }
    case 3: {
      const arrow = Array.from({ length: n - 1 }, (_, i) => [0, i + 1] as const);
      return build("arrow", n, arrow, never, one, random, symmetric);
    }
    case 4:
      return build(
        "disconnected",
        n,
        some.filter(([i, j]) => i % 3 === j % 3),
        never,
        one,
        random,
        symmetric,
      );
    case 5:
      // An even chain without diagonal has one perfect matching, hence det ≠ 0.
      return build(
        "zero diagonal",
        n + (n % 2),
        n % 2 === 0 ? chain : [...chain, [n - 1, n]],
        () => true,
        one,
        random,
        symmetric,
      );
    case 6: {
      // Entries of very different size without any scaling behind them: many refused pivots.
      const blocks = some.map(([i, j]) => [i, Math.min(n - 1, i + (j % 5))] as const);
      const base = build("uneven entries", n, blocks, (i) => n > 1 && i % 3 === 0, one, random, symmetric);
      return uneven(base, random, symmetric);
    }
    default: {
      const all = Array.from({ length: n * n }, (_, t) => [t % n, Math.floor(t / n)] as const);
      return build(
        "dense with half the diagonal zero",
        n,
        all,
        (i) => n > 1 && i % 2 === 0,
        one,
        random,
        symmetric,
      );
    }
  }
}

/**
 * A grid of square four-node elements with three dofs per node, one of them 10⁵ times stiffer,
 * and unsymmetric imaginary values; symmetric real part K − shift.
 */
export function plateCase(side: number, seed: number): SparseCase & { readonly groups: Int32Array } {
  const random = uniform(seed);
  const stiffness = [1e5, 1, 1];
  const rows: number[] = [];
  const cols: number[] = [];
  const re: number[] = [];
  const im: number[] = [];
  for (let x = 0; x + 1 < side; x++) {
    for (let y = 0; y + 1 < side; y++) {
      const dofs = [0, 1, side, side + 1].flatMap((d) => [0, 1, 2].map((k) => 3 * (x * side + y + d) + k));
      const factor = Array.from({ length: 12 * 11 }, () => random() - 0.5);
      for (let i = 0; i < 12; i++) {
        for (let j = 0; j < 12; j++) {
          let k = i === j ? -0.05 : 0;
          for (let p = 0; p < 11; p++) k += factor[11 * i + p]! * factor[11 * j + p]!;
          const scale = stiffness[i % 3]! * stiffness[j % 3]!;
          rows.push(dofs[i]!);
          cols.push(dofs[j]!);
          re.push(k * scale);
          im.push((0.05 * k + 0.06 * (random() - 0.5)) * scale);
        }
      }
    }
  }
  const n = 3 * side * side;
  const a = fromTriplets(n, n, rows, cols, re);
  const groups = Int32Array.from({ length: n }, (_, i) => Math.floor(i / 3));
  return { name: "plate", a, im: fromTriplets(n, n, rows, cols, im).values, groups };
}

/** A plate with `ties` Lagrange multipliers that make rotations of neighbouring nodes equal: [K Gᵀ; G 0]. */
export function tiedPlateCase(side: number, ties: number): SparseCase {
  const { a, im } = plateCase(side, 5);
  const n = a.cols;
  const rows = Array.from(a.rowIndex);
  const cols: number[] = [];
  for (let j = 0; j < n; j++) for (let p = a.colStart[j]!; p < a.colStart[j + 1]!; p++) cols.push(j);
  const re = Array.from(a.values);
  const imaginary = Array.from(im);
  const enter = (i: number, j: number, value: number): void => {
    rows.push(i);
    cols.push(j);
    re.push(value);
    imaginary.push(0);
  };
  for (let t = 0; t < ties; t++) {
    enter(n + t, n + t, 0);
    for (const [dof, sign] of [
      [6 * t + 1, 1],
      [6 * t + 4, -1],
    ] as const) {
      enter(n + t, dof, sign);
      enter(dof, n + t, sign);
    }
  }
  const order = n + ties;
  const tied = fromTriplets(order, order, rows, cols, re);
  return { name: "tied plate", a: tied, im: fromTriplets(order, order, rows, cols, imaginary).values };
}

/** The same tests once with each build of the kernels. */
export function describeWithEveryKernel(what: string, body: () => void): void {
  for (const kernel of KERNEL_NAMES) {
    describe(`${what}, ${kernel} kernel`, () => {
      beforeAll(() => useKernel(kernel));
      afterAll(() => useKernel());
      body();
    });
  }
}
