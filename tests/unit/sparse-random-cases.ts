/**
 * Small random matrices that mix every trouble a dynamic stiffness can make: a structure, and on it any of zero
 * diagonals, zero blocks, dense rows, repeated blocks, loose parts, rank deficiency, wild scales, uneven entries and
 * resonance almost without damping.
 */

import { EigenvalueDecomposition, Matrix } from "ml-matrix";
import { createRandom, type Random } from "../../src/numerics/random.js";
import type { ComplexValues, SparsePattern } from "../../src/numerics/sparse/sparse-matrix.js";

export interface RandomCase {
  /** Seed, order and troubles, for messages. */
  readonly name: string;
  /** Singular in exact arithmetic. */
  readonly singular: boolean;
  readonly pattern: SparsePattern;
  readonly complex: ComplexValues;
  /** Real symmetric values on the pattern. */
  readonly symmetric: Float64Array;
}

/** Dense while it is being spoilt: entry (i, j) at i + j n. `symmetric` and `re` differ by small unsymmetric values. */
interface Draft {
  readonly n: number;
  readonly there: Uint8Array;
  readonly symmetric: Float64Array;
  readonly re: Float64Array;
  readonly im: Float64Array;
}

type Trouble = readonly [name: string, chance: number, spoil: (draft: Draft, random: Random) => void];

/** In this order: what breaks exact rank deficiency comes before it, scales last. */
const troubles: readonly Trouble[] = [
  ["dense rows", 0.2, addDenseRows],
  ["loose parts", 0.15, cutApart],
  ["uneven entries", 0.15, spreadEntries],
  ["zero diagonals", 0.25, clearDiagonals],
  ["zero block", 0.2, clearBlock],
  ["repeated blocks", 0.15, repeatBlock],
  ["resonance", 0.2, tuneToResonance],
  ["singular", 0.12, copyDof],
  ["scales", 0.3, scaleSymmetrically],
];

export function randomCase(seed: number): RandomCase {
  const random = createRandom(seed);
  const n = seed <= 12 ? 1 + (seed % 4) : 1 + Math.floor(80 * random.uniform() ** 1.3);
  const draft = drawStructure(n, random);
  const met: string[] = [];
  for (const [name, chance, spoil] of troubles) {
    if (random.uniform() >= chance || (name === "singular" && n < 2)) continue;
    spoil(draft, random);
    met.push(name);
  }
  const name = `seed ${seed}, order ${n}: ${met.join(", ") || "no trouble"}`;
  return { name, singular: met.includes("singular"), ...sparseOf(draft) };
}

const centred = (random: Random): number => 2 * random.uniform() - 1;

function drawStructure(n: number, random: Random): Draft {
  const size = n * n;
  const draft: Draft = {
    n,
    there: new Uint8Array(size),
    symmetric: new Float64Array(size),
    re: new Float64Array(size),
    im: new Float64Array(size),
  };
  for (let i = 0; i < n; i++) couple(draft, i, i, random);
  const side = Math.max(1, Math.floor(Math.sqrt(n)));
  const kind = random.integer(5);
  for (let i = 1; i < n; i++) {
    if (kind === 0) couple(draft, i, i - 1, random);
    if (kind === 1) couple(draft, i, random.integer(i), random);
    if (kind === 2) for (let k = 0; k < 3; k++) couple(draft, random.integer(n), random.integer(n), random);
    if (kind === 3) for (let j = Math.max(0, i - 4); j < i; j++) couple(draft, i, j, random);
    if (kind === 4) {
      if (i % side !== 0) couple(draft, i, i - 1, random);
      if (i >= side) couple(draft, i, i - side, random);
    }
  }
  return draft;
}

/** Enters (i, j) and (j, i): equal in the symmetric matrix, unequal in the complex one. */
function couple({ n, there, symmetric, re, im }: Draft, i: number, j: number, random: Random): void {
  const value = centred(random);
  const feeding = random.uniform() < 0.5 ? 0.01 : 1;
  for (const p of [i + j * n, j + i * n]) {
    there[p] = 1;
    symmetric[p] = value;
    re[p] = value + feeding * centred(random);
    im[p] = 0.1 * centred(random);
  }
}

function addDenseRows(draft: Draft, random: Random): void {
  for (let k = 0; k <= random.integer(3); k++) {
    const hub = random.integer(draft.n);
    for (let i = 0; i < draft.n; i++) if (i !== hub) couple(draft, hub, i, random);
  }
}

/** Sets entries to zero but leaves them in the pattern. */
function clear({ n, symmetric, re, im }: Draft, chosen: (i: number, j: number) => boolean): void {
  for (let p = 0; p < n * n; p++) {
    if (chosen(p % n, Math.floor(p / n))) symmetric[p] = re[p] = im[p] = 0;
  }
}

function cutApart(draft: Draft, random: Random): void {
  const parts = 2 + random.integer(3);
  const { n, there } = draft;
  const apart = (i: number, j: number): boolean => i % parts !== j % parts;
  clear(draft, apart);
  const keepsPattern = random.uniform() < 0.5;
  for (let p = 0; p < n * n; p++) if (!keepsPattern && apart(p % n, Math.floor(p / n))) there[p] = 0;
}

function spreadEntries({ n, symmetric, re, im }: Draft, random: Random): void {
  for (let j = 0; j < n; j++) {
    for (let i = 0; i <= j; i++) {
      const factor = 2 ** (random.integer(25) - 12);
      for (const p of i === j ? [i + j * n] : [i + j * n, j + i * n]) {
        symmetric[p] *= factor;
        re[p] *= factor;
        im[p] *= factor;
      }
    }
  }
}

function clearDiagonals(draft: Draft, random: Random): void {
  const share = random.uniform();
  const cleared = Array.from({ length: draft.n }, () => random.uniform() < share);
  clear(draft, (i, j) => i === j && cleared[i]!);
}

/** Constraints: at most a third of the dofs, with each other uncoupled. */
function clearBlock(draft: Draft, random: Random): void {
  const { n } = draft;
  const first = n - Math.floor((n * random.uniform()) / 3);
  for (let i = first; i < n; i++) for (let k = 0; k < 2; k++) couple(draft, i, random.integer(first), random);
  clear(draft, (i, j) => i >= first && j >= first);
}

/** The leading block again and again down the diagonal, otherwise nothing: every eigenvalue is repeated. */
function repeatBlock({ n, there, symmetric, re, im }: Draft, random: Random): void {
  const size = 1 + random.integer(Math.max(1, Math.floor(n / 3)));
  for (let p = 0; p < n * n; p++) {
    const i = p % n;
    const j = Math.floor(p / n);
    const within = Math.floor(i / size) === Math.floor(j / size);
    const source = (i % size) + (j % size) * n;
    there[p] = within ? there[source]! : 0;
    symmetric[p] = within ? symmetric[source]! : 0;
    re[p] = within ? re[source]! : 0;
    im[p] = within ? im[source]! : 0;
  }
}

/** Shifts by almost an eigenvalue of the symmetric part, and takes nearly all damping and feeding away. */
function tuneToResonance({ n, there, symmetric, re, im }: Draft, random: Random): void {
  const dense = Matrix.from1DArray(n, n, symmetric);
  const eigenvalues = new EigenvalueDecomposition(dense, { assumeSymmetric: true }).realEigenvalues;
  const shift = eigenvalues[random.integer(n)]! + 2 ** -(10 + random.integer(32));
  for (let p = 0; p < n * n; p++) {
    if (there[p] === 0) continue;
    if (p % (n + 1) === 0) symmetric[p] -= shift;
    re[p] = symmetric[p]!;
    im[p] *= 2 ** -30;
  }
}

/** Makes one dof the copy of another: equal rows and equal columns. */
function copyDof({ n, there, symmetric, re, im }: Draft, random: Random): void {
  const from = random.integer(n);
  const to = (from + 1 + random.integer(n - 1)) % n;
  for (const values of [there, symmetric, re, im]) {
    for (let i = 0; i < n; i++) values[i + to * n] = values[i + from * n]!;
    for (let j = 0; j < n; j++) values[to + j * n] = values[from + j * n]!;
  }
}

/** S A S with S from 2⁻²⁰ to 2²⁰, about 10^±6 each, 10^±12 together. */
function scaleSymmetrically({ n, symmetric, re, im }: Draft, random: Random): void {
  const scale = Array.from({ length: n }, () => 2 ** (random.integer(41) - 20));
  for (let p = 0; p < n * n; p++) {
    const factor = scale[p % n]! * scale[Math.floor(p / n)]!;
    symmetric[p] *= factor;
    re[p] *= factor;
    im[p] *= factor;
  }
}

function sparseOf({ n, there, symmetric, re, im }: Draft): Omit<RandomCase, "name" | "singular"> {
  const colStart = new Int32Array(n + 1);
  const kept: number[] = [];
  for (let p = 0; p < n * n; p++) {
    const mirrored = Math.floor(p / n) + (p % n) * n;
    if (there[p] === 1 || there[mirrored] === 1 || p === mirrored) kept.push(p);
    colStart[Math.floor(p / n) + 1] = kept.length;
  }
  const rowIndex = Int32Array.from(kept, (p) => p % n);
  const pick = (values: Float64Array): Float64Array => Float64Array.from(kept, (p) => values[p]!);
  return {
    pattern: { rows: n, cols: n, colStart, rowIndex },
    complex: { re: pick(re), im: pick(im) },
    symmetric: pick(symmetric),
  };
}
