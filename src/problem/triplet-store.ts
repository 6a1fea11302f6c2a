/** Entries that arrive one by one. Grows as they come: a count declared in a file is only an upper bound. */
export class TripletStore {
  private readonly most: number;
  private row: Int32Array;
  private col: Int32Array;
  private value: Float64Array;
  private count = 0;

  /** @param most - Number of entries that will not be exceeded. */
  constructor(most: number) {
    this.most = most;
    const capacity = Math.min(most, 1 << 16);
    this.row = new Int32Array(capacity);
    this.col = new Int32Array(capacity);
    this.value = new Float64Array(capacity);
  }

  push(i: number, j: number, value: number): void {
    const t = this.count++;
    if (t === this.row.length) this.grow();
    this.row[t] = i;
    this.col[t] = j;
    this.value[t] = value;
  }

  arrays(): { readonly row: Int32Array; readonly col: Int32Array; readonly value: Float64Array } {
    const { row, col, value, count } = this;
    if (count === row.length) return { row, col, value };
    return { row: row.slice(0, count), col: col.slice(0, count), value: value.slice(0, count) };
  }

  private grow(): void {
    const capacity = Math.min(Math.max(this.most, this.count), 2 * this.row.length + 16);
    const row = new Int32Array(capacity);
    const col = new Int32Array(capacity);
    const value = new Float64Array(capacity);
    row.set(this.row);
    col.set(this.col);
    value.set(this.value);
    this.row = row;
    this.col = col;
    this.value = value;
  }
}
