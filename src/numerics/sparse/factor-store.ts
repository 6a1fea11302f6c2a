/**
 * Room for the factors of many fronts: few large arrays instead of one small array per front.
 * The first holds what the analysis predicts; delayed pivots may ask for more. What a finished
 * factorisation gives back serves the next one of its size: fresh memory costs as much as a fifth
 * of a factorisation, page by page.
 */

/** Arrays given back in this thread, of any contents. */
const spare: Float64Array[] = [];
/** Two stores of two kinds: enough for one factorisation to follow another. */
const MOST_SPARE = 4;
/** A spare array may be this much larger than asked for. */
const GENEROUS = 1.25;

export class FactorStore {
  private chunks: Float64Array[] = [];
  private used = 0;
  private readonly chunkSize: number;

  constructor(predicted: number) {
    this.chunkSize = Math.max(1024, predicted);
    this.chunks.push(takeArray(this.chunkSize));
  }

  /** Number of the chunk and index in it of `size` consecutive entries, not cleared. */
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

  /** Gives the memory back; the store is empty afterwards. */
  release(): void {
    const first = this.chunks[0];
    if (first === undefined) return;
    spare.push(first);
    if (spare.length > MOST_SPARE) spare.shift();
    this.chunks = [];
  }
}

function takeArray(size: number): Float64Array {
  const at = spare.findIndex(({ length }) => length >= size && length <= GENEROUS * size);
  return at < 0 ? new Float64Array(size) : spare.splice(at, 1)[0];
}
