/**
 * Arithmetic on lanes. One source serves every build: a lane is a vector of two doubles or, where
 * the machine has none, a single double, and the compiler keeps the branch that fits.
 */

import { Lane } from "./lane";

export function widthOf(): i32 {
  return isVector<Lane>() ? 2 : 1;
}

export function zero(): Lane {
  if (isVector<Lane>()) return f64x2.splat(0);
  return <Lane>0;
}

export function splat(x: f64): Lane {
  if (isVector<Lane>()) return f64x2.splat(x);
  return <Lane>x;
}

/** The double at this address in every lane. */
export function splatAt(at: usize): Lane {
  if (isVector<Lane>()) return v128.load64_splat(at);
  return load<Lane>(at);
}

export function add(a: Lane, b: Lane): Lane {
  if (isVector<Lane>()) return f64x2.add(a, b);
  return <Lane>(a + b);
}

export function subtract(a: Lane, b: Lane): Lane {
  if (isVector<Lane>()) return f64x2.sub(a, b);
  return <Lane>(a - b);
}

export function multiply(a: Lane, b: Lane): Lane {
  if (isVector<Lane>()) return f64x2.mul(a, b);
  return <Lane>(a * b);
}

/** c + a b. */
export function multiplyAdd(a: Lane, b: Lane, c: Lane): Lane {
  if (isVector<Lane>()) {
    if (ASC_FEATURE_RELAXED_SIMD) return f64x2.relaxed_madd(a, b, c);
    return f64x2.add(c, f64x2.mul(a, b));
  }
  return <Lane>(c + a * b);
}

/** c − a b. */
export function multiplySubtract(a: Lane, b: Lane, c: Lane): Lane {
  if (isVector<Lane>()) {
    if (ASC_FEATURE_RELAXED_SIMD) return f64x2.relaxed_nmadd(a, b, c);
    return f64x2.sub(c, f64x2.mul(a, b));
  }
  return <Lane>(c - a * b);
}

/** The larger of each lane; a NaN in b is passed over. */
export function larger(a: Lane, b: Lane): Lane {
  if (isVector<Lane>()) return f64x2.pmax(a, b);
  return a < b ? b : a;
}

/** The largest lane. */
export function largestLane(a: Lane): f64 {
  if (isVector<Lane>()) {
    return max<f64>(f64x2.extract_lane(a, 0), f64x2.extract_lane(a, 1));
  }
  return <f64>a;
}

/** The sum of the lanes. */
export function sumOfLanes(a: Lane): f64 {
  if (isVector<Lane>()) return f64x2.extract_lane(a, 0) + f64x2.extract_lane(a, 1);
  return <f64>a;
}

/** The modulus of every lane. */
export function magnitude(a: Lane): Lane {
  if (isVector<Lane>()) return f64x2.abs(a);
  return <Lane>abs<f64>(<f64>a);
}

/** The `left` doubles from `from` on, then zeros, `count` in all. */
export function copyPadded(to: usize, from: usize, left: i32, count: i32): void {
  for (let t = 0; t < count; t++) {
    const at = (<usize>t) << 3;
    store<f64>(to + at, t < left ? load<f64>(from + at) : 0);
  }
}
