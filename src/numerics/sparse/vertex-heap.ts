/** A binary heap of vertices with the largest key on top; keys may change while a vertex is inside. */
export class VertexHeap {
  private readonly vertices: Int32Array;
  /** Place of each vertex in the heap, −1 outside. */
  private readonly placeOf: Int32Array;
  private readonly key: Float64Array;
  private size = 0;

  /** @param order - Vertices are numbered 0 … order − 1. */
  constructor(order: number) {
    this.vertices = new Int32Array(order);
    this.placeOf = new Int32Array(order).fill(-1);
    this.key = new Float64Array(order);
  }

  clear(): void {
    for (let t = 0; t < this.size; t++) this.placeOf[this.vertices[t]] = -1;
    this.size = 0;
  }

  insert(v: number, key: number): void {
    this.key[v] = key;
    this.rise(v, this.size++);
  }

  /** Adds a positive amount to the key of v; a vertex outside the heap is left alone. */
  raise(v: number, amount: number): void {
    const place = this.placeOf[v];
    if (place < 0) return;
    this.key[v] += amount;
    this.rise(v, place);
  }

  /** Takes out the vertex with the largest key; −1 when the heap is empty. */
  takeLargest(): number {
    if (this.size === 0) return -1;
    const top = this.vertices[0];
    const last = this.vertices[--this.size];
    this.placeOf[top] = -1;
    if (this.size > 0) this.sink(last);
    return top;
  }

  private rise(v: number, from: number): void {
    const { vertices, placeOf, key } = this;
    const own = key[v];
    let place = from;
    while (place > 0) {
      const above = (place - 1) >> 1;
      const u = vertices[above];
      if (key[u] >= own) break;
      vertices[place] = u;
      placeOf[u] = place;
      place = above;
    }
    vertices[place] = v;
    placeOf[v] = place;
  }

  private sink(v: number): void {
    const { vertices, placeOf, key, size } = this;
    const own = key[v];
    let place = 0;
    for (let child = 1; child < size; child = 2 * place + 1) {
      if (child + 1 < size && key[vertices[child + 1]] > key[vertices[child]]) child++;
      const u = vertices[child];
      if (key[u] <= own) break;
      vertices[place] = u;
      placeOf[u] = place;
      place = child;
    }
    vertices[place] = v;
    placeOf[v] = place;
  }
}
