/**
 * Seeded random numbers: every random choice of this program goes through one
 * of these, so that equal seeds give equal results on every machine.
 */

/** A stream of random numbers. */
export interface Random {
  /** Uniform in [0, 1), 32 random bits. */
  uniform(): number;
  /** Standard normal. */
  normal(): number;
  /** Uniform integer in 0 … below − 1; `below` from 1 to 2³². */
  integer(below: number): number;
}

/**
 * The generator xoshiro128**, its state filled by splitmix32 from `seed`
 * (any finite number; the low 32 bits of its integer part count).
 *
 * Source: Blackman & Vigna, ACM Trans. Math. Softw. 47(4), 2021, article 36.
 */
export function createRandom(seed: number): Random {
  const state = seededState(seed);
  let spare = Number.NaN;

  function next(): number {
    const result = Math.imul(rotateLeft(Math.imul(state[1], 5), 7), 9) >>> 0;
    const shifted = state[1] << 9;
    state[2] ^= state[0];
    state[3] ^= state[1];
    state[1] ^= state[2];
    state[0] ^= state[3];
    state[2] ^= shifted;
    state[3] = rotateLeft(state[3], 11);
    return result;
  }

  function uniform(): number {
    return next() / 4294967296;
  }

  // Marsaglia's polar method makes two numbers at a time; the second waits in `spare`.
  function normal(): number {
    if (!Number.isNaN(spare)) {
      const kept = spare;
      spare = Number.NaN;
      return kept;
    }
    for (;;) {
      const x = 2 * uniform() - 1;
      const y = 2 * uniform() - 1;
      const square = x * x + y * y;
      if (square === 0 || square >= 1) continue;
      const factor = Math.sqrt((-2 * Math.log(square)) / square);
      spare = y * factor;
      return x * factor;
    }
  }

  return { uniform, normal, integer: (below) => Math.floor(uniform() * below) };
}

function seededState(seed: number): Int32Array {
  const state = new Int32Array(4);
  let counter = Math.trunc(seed) | 0;
  for (let i = 0; i < 4; i++) {
    counter = (counter + 0x9e3779b9) | 0;
    let mixed = counter ^ (counter >>> 16);
    mixed = Math.imul(mixed, 0x21f0aaad);
    mixed ^= mixed >>> 15;
    mixed = Math.imul(mixed, 0x735a2d97);
    state[i] = mixed ^ (mixed >>> 15);
  }
  return state;
}

function rotateLeft(x: number, bits: number): number {
  return (x << bits) | (x >>> (32 - bits));
}
