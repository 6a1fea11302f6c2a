/**
 * Plain data for other threads: its large arrays move into memory that all threads see, so that
 * sending it copies the small rest only.
 */

type NumericArray = Float64Array | Int32Array | Uint8Array;

const numericArrays = [Float64Array, Int32Array, Uint8Array] as const;

/**
 * A copy whose arrays of numbers lie in shared memory. The same object met twice becomes the same
 * copy, so identities inside the data survive.
 *
 * @param replace - what stands for an object that threads cannot exchange; undefined: copy it.
 */
export function shared<T>(data: T, replace: (value: object) => object | undefined = () => undefined): T {
  return new Sharing(replace).copy(data) as T;
}

class Sharing {
  private readonly known = new Map<object, unknown>();
  private readonly replace: (value: object) => object | undefined;

  constructor(replace: (value: object) => object | undefined) {
    this.replace = replace;
  }

  copy(value: unknown): unknown {
    if (typeof value !== "object" || value === null) return value;
    const before = this.known.get(value);
    if (before !== undefined) return before;
    const after = this.replace(value) ?? this.copyObject(value);
    this.known.set(value, after);
    return after;
  }

  private copyObject(value: object): unknown {
    const array = sharedArray(value);
    if (array !== undefined) return array;
    if (Array.isArray(value)) return value.map((item) => this.copy(item));
    if (value instanceof Map) return new Map([...value].map(([key, item]) => [key, this.copy(item)]));
    if (value instanceof Set) return new Set([...value].map((item) => this.copy(item)));
    return Object.fromEntries(Object.entries(value).map(([key, item]) => [key, this.copy(item)]));
  }
}

function sharedArray(value: object): NumericArray | undefined {
  const NumericArray = numericArrays.find((kind) => value instanceof kind);
  if (NumericArray === undefined) return undefined;
  const array = value as NumericArray;
  const copy: NumericArray = new NumericArray(new SharedArrayBuffer(array.byteLength) as never);
  copy.set(array);
  return copy;
}

/** Puts back, throughout plain data, the objects that stand-ins were sent for. Changes `data` in place. */
export function revive<T>(data: T, restore: (value: object) => object | undefined): T {
  const seen = new Set<object>();
  const visit = (value: unknown): unknown => {
    if (typeof value !== "object" || value === null) return value;
    const restored = restore(value);
    if (restored !== undefined) return restored;
    if (seen.has(value) || ArrayBuffer.isView(value)) return value;
    seen.add(value);
    if (value instanceof Map) for (const [key, item] of value) value.set(key, visit(item));
    else if (!(value instanceof Set)) {
      const record = value as Record<string, unknown>;
      for (const key of Object.keys(record)) record[key] = visit(record[key]);
    }
    return value;
  };
  return visit(data) as T;
}
