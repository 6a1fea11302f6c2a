/**
 * Room for the factors of many fronts: few large arrays instead of one small array per front.
 * The first holds what the analysis predicts; delayed pivots may ask for more.
 */
export class FactorStore {
  private readonly chunks: Float64Array[] = [];
  private used = 0;
  private readonly chunkSize: number;

  constructor(predicted: number) {
    this.chunkSize = Math.max(1024, predicted);
    this.chunks.push(new Float64Array(this.chunkSize));
  }

  /** Number of the chunk and index in it of `size` consecutive entries, all zero. */
  reserve(size: number): { readonly chunk: number; readonly at: number } {
    let chunk = this.chunks.length - 1;
    if (this.used + size > this.chunks[chunk].length) {
      this.chunks.push(new Float64Array(Math.max(size, this.chunkSize >> 2)));
      this.used = 0;
      chunk++;
    }
    const at = this.used;
    this.used += size;
    return { chunk, at };
  }

  array(chunk: number): Float64Array {
    return this.chunks[chunk];
  }
}
