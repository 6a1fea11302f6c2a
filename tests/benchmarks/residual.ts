import type { ComplexMatrix } from "../../src/numerics/dense/matrix.js";
import type { ComplexValues, SparsePattern } from "../../src/numerics/sparse/sparse-matrix.js";

/** Worst ‖b − A x‖ / (‖A‖ ‖x‖ + ‖b‖) of the columns in infinity norms, apart from the solver's own account. */
export function complexBackwardError(
  { cols: n, colStart, rowIndex }: SparsePattern,
  { re, im }: ComplexValues,
  x: ComplexMatrix,
  b: ComplexMatrix,
): number {
  const largest = (r: ArrayLike<number>, i: ArrayLike<number>, from: number): number => {
    let most = 0;
    for (let k = 0; k < n; k++) most = Math.max(most, Math.hypot(r[from + k], i[from + k]));
    return most;
  };
  const rowSum = new Float64Array(n);
  for (let p = 0; p < rowIndex.length; p++) rowSum[rowIndex[p]] += Math.hypot(re[p], im[p]);
  const norm = rowSum.reduce((a, s) => Math.max(a, s), 0);
  let worst = 0;
  for (let c = 0; c < b.cols; c++) {
    const rRe = b.re.slice(c * n, (c + 1) * n);
    const rIm = b.im.slice(c * n, (c + 1) * n);
    for (let j = 0; j < n; j++) {
      const xRe = x.re[c * n + j];
      const xIm = x.im[c * n + j];
      for (let p = colStart[j]; p < colStart[j + 1]; p++) {
        rRe[rowIndex[p]] -= re[p] * xRe - im[p] * xIm;
        rIm[rowIndex[p]] -= re[p] * xIm + im[p] * xRe;
      }
    }
    const scale = norm * largest(x.re, x.im, c * n) + largest(b.re, b.im, c * n);
    worst = Math.max(worst, largest(rRe, rIm, 0) / scale);
  }
  return worst;
}
