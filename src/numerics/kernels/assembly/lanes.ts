/**
 * One source for every build: `V` is a vector of two doubles where the machine has them and a
 * single double otherwise, and the compiler keeps the branch that fits.
 */

export function widthOf<V>(): i32 {
  return isVector<V>() ? 2 : 1;
}

export function zero<V>(): V {
  if (isVector<V>()) return f64x2.splat(0);
  return <V>0;
}

export function splat<V>(x: f64): V {
  if (isVector<V>()) return f64x2.splat(x);
  return <V>x;
}

/** The double at this address in every lane. */
export function splatAt<V>(at: usize): V {
  if (isVector<V>()) return v128.load64_splat(at);
  return load<V>(at);
}

export function add<V>(a: V, b: V): V {
  if (isVector<V>()) return f64x2.add(a, b);
  return <V>(a + b);
}

export function subtract<V>(a: V, b: V): V {
  if (isVector<V>()) return f64x2.sub(a, b);
  return <V>(a - b);
}

export function multiply<V>(a: V, b: V): V {
  if (isVector<V>()) return f64x2.mul(a, b);
  return <V>(a * b);
}

/** c + a b. */
export function multiplyAdd<V>(a: V, b: V, c: V): V {
  if (isVector<V>()) {
    if (ASC_FEATURE_RELAXED_SIMD) return f64x2.relaxed_madd(a, b, c);
    return f64x2.add(c, f64x2.mul(a, b));
  }
  return <V>(c + a * b);
}

/** c − a b. */
export function multiplySubtract<V>(a: V, b: V, c: V): V {
  if (isVector<V>()) {
    if (ASC_FEATURE_RELAXED_SIMD) return f64x2.relaxed_nmadd(a, b, c);
    return f64x2.sub(c, f64x2.mul(a, b));
  }
  return <V>(c - a * b);
}

/** The larger of each lane; a NaN in b is passed over. */
export function larger<V>(a: V, b: V): V {
  if (isVector<V>()) return f64x2.pmax(a, b);
  return a < b ? b : a;
}

/** The largest lane. */
export function largestLane<V>(a: V): f64 {
  if (isVector<V>()) {
    return max<f64>(f64x2.extract_lane(a, 0), f64x2.extract_lane(a, 1));
  }
  return <f64>a;
}

/** The sum of the lanes. */
export function sumOfLanes<V>(a: V): f64 {
  if (isVector<V>()) return f64x2.extract_lane(a, 0) + f64x2.extract_lane(a, 1);
  return <f64>a;
}

/** The modulus of every lane. */
export function magnitude<V>(a: V): V {
  if (isVector<V>()) return f64x2.abs(a);
  return <V>abs<f64>(<f64>a);
}

/** The `left` doubles from `from` on, then zeros, `count` in all. */
export function copyPadded(to: usize, from: usize, left: i32, count: i32): void {
  for (let t = 0; t < count; t++) {
    const at = (<usize>t) << 3;
    store<f64>(to + at, t < left ? load<f64>(from + at) : 0);
  }
}
