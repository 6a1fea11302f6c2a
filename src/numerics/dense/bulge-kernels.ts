/** Applying the reflectors of a QR sweep to the parts of a matrix away from the bulge. */

/** The reflectors of one sweep; number k acts on components k, k + 1, k + 2 as I − τ (1 v w)ᵀ(1 v w). */
export interface Reflectors {
  readonly tau: Float64Array;
  readonly v: Float64Array;
  readonly w: Float64Array;
}

/**
 * Applies reflectors `first` to `end` − 1 in turn to `count` vectors, vector c at
 * `at + c * stride`. Four vectors go together, which hides the latency of the
 * chain through one vector; every entry is loaded and stored once. With `short`
 * the last reflector acts on two components only.
 */
// biome-ignore lint/complexity/noExcessiveLinesPerFunction: an unrolled kernel
export function reflectVectors(
  x: Float64Array,
  at: number,
  stride: number,
  count: number,
  { tau, v, w }: Reflectors,
  first: number,
  end: number,
  short: boolean,
): void {
  const full = short ? end - 1 : end;
  let c = 0;
  for (; c + 3 < count; c += 4) {
    const p = at + c * stride;
    const q = p + stride;
    const r = q + stride;
    const s = r + stride;
    let p0 = x[p + first];
    let q0 = x[q + first];
    let r0 = x[r + first];
    let s0 = x[s + first];
    let p1 = x[p + first + 1];
    let q1 = x[q + first + 1];
    let r1 = x[r + first + 1];
    let s1 = x[s + first + 1];
    for (let k = first; k < full; k++) {
      const t = tau[k];
      const a = v[k];
      const b = w[k];
      const p2 = x[p + k + 2];
      const pt = (p0 + a * p1 + b * p2) * t;
      x[p + k] = p0 - pt;
      p0 = p1 - pt * a;
      p1 = p2 - pt * b;
      const q2 = x[q + k + 2];
      const qt = (q0 + a * q1 + b * q2) * t;
      x[q + k] = q0 - qt;
      q0 = q1 - qt * a;
      q1 = q2 - qt * b;
      const r2 = x[r + k + 2];
      const rt = (r0 + a * r1 + b * r2) * t;
      x[r + k] = r0 - rt;
      r0 = r1 - rt * a;
      r1 = r2 - rt * b;
      const s2 = x[s + k + 2];
      const st = (s0 + a * s1 + b * s2) * t;
      x[s + k] = s0 - st;
      s0 = s1 - st * a;
      s1 = s2 - st * b;
    }
    if (short) {
      const pt = (p0 + v[full] * p1) * tau[full];
      p0 -= pt;
      p1 -= pt * v[full];
      const qt = (q0 + v[full] * q1) * tau[full];
      q0 -= qt;
      q1 -= qt * v[full];
      const rt = (r0 + v[full] * r1) * tau[full];
      r0 -= rt;
      r1 -= rt * v[full];
      const st = (s0 + v[full] * s1) * tau[full];
      s0 -= st;
      s1 -= st * v[full];
    }
    x[p + full] = p0;
    x[q + full] = q0;
    x[r + full] = r0;
    x[s + full] = s0;
    x[p + full + 1] = p1;
    x[q + full + 1] = q1;
    x[r + full + 1] = r1;
    x[s + full + 1] = s1;
  }
  for (; c < count; c++) {
    const p = at + c * stride;
    for (let k = first; k < full; k++) {
      const sum = (x[p + k] + v[k] * x[p + k + 1] + w[k] * x[p + k + 2]) * tau[k];
      x[p + k] -= sum;
      x[p + k + 1] -= sum * v[k];
      x[p + k + 2] -= sum * w[k];
    }
    if (short) {
      const sum = (x[p + full] + v[full] * x[p + full + 1]) * tau[full];
      x[p + full] -= sum;
      x[p + full + 1] -= sum * v[full];
    }
  }
}

/**
 * Applies reflectors `first` to `end` − 1 in turn from the right to rows
 * `rowBegin` to `rowEnd` − 1 of a matrix by columns: two reflectors per pass.
 */
export function reflectColumns(
  x: Float64Array,
  stride: number,
  rowBegin: number,
  rowEnd: number,
  { tau, v, w }: Reflectors,
  first: number,
  end: number,
  short: boolean,
): void {
  const full = short ? end - 1 : end;
  let k = first;
  for (; k + 1 < full; k += 2) {
    const t = tau[k];
    const a = v[k];
    const b = w[k];
    const u = tau[k + 1];
    const c = v[k + 1];
    const d = w[k + 1];
    const p0 = k * stride;
    const p1 = p0 + stride;
    const p2 = p1 + stride;
    const p3 = p2 + stride;
    for (let i = rowBegin; i < rowEnd; i++) {
      const x0 = x[p0 + i];
      let x1 = x[p1 + i];
      let x2 = x[p2 + i];
      const x3 = x[p3 + i];
      const s = (x0 + a * x1 + b * x2) * t;
      x[p0 + i] = x0 - s;
      x1 -= s * a;
      x2 -= s * b;
      const r = (x1 + c * x2 + d * x3) * u;
      x[p1 + i] = x1 - r;
      x[p2 + i] = x2 - r * c;
      x[p3 + i] = x3 - r * d;
    }
  }
  for (; k < end; k++) {
    const t = tau[k];
    const a = v[k];
    const p0 = k * stride;
    const p1 = p0 + stride;
    if (short && k === full) {
      for (let i = rowBegin; i < rowEnd; i++) {
        const s = (x[p0 + i] + a * x[p1 + i]) * t;
        x[p0 + i] -= s;
        x[p1 + i] -= s * a;
      }
      continue;
    }
    const b = w[k];
    const p2 = p1 + stride;
    for (let i = rowBegin; i < rowEnd; i++) {
      const s = (x[p0 + i] + a * x[p1 + i] + b * x[p2 + i]) * t;
      x[p0 + i] -= s;
      x[p1 + i] -= s * a;
      x[p2 + i] -= s * b;
    }
  }
}
