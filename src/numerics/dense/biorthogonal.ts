import { factorDenseComplex } from "./lu.js";
import { type ComplexMatrix, complexZeros } from "./matrix.js";

/** Eigenvalues closer than this, relative to the largest, share one cluster: beyond it rounding leaves yᴴx below 1e-10. */
const clusterWidth = 1e-6;

/**
 * Makes YᴴX = I inside every cluster of (nearly) equal eigenvalues, in place: left and right vectors of a multiple
 * eigenvalue are each some basis of their space, and only bases that match give its residues. Simple
 * eigenvalues are left alone, and so are clusters whose Gram matrix is singular to rounding.
 *
 * @param least - Eigenvalues of smaller modulus are left alone too.
 * @returns whether every cluster could be matched.
 */
export function biorthogonalise(
  re: Float64Array,
  im: Float64Array,
  right: ComplexMatrix,
  left: ComplexMatrix,
  least: number,
): boolean {
  let matched = true;
  for (const cluster of clustersOf(re, im, least)) matched = matchCluster(cluster, right, left) && matched;
  return matched;
}

/** Index sets of two and more, joined by single links. */
function clustersOf(re: Float64Array, im: Float64Array, least: number): number[][] {
  const modulus = Array.from(re, (value, j) => Math.hypot(value, im[j]));
  const width = clusterWidth * modulus.reduce((high, value) => Math.max(high, value), 0);
  const order = Array.from(re.keys())
    .filter((j) => modulus[j] >= least)
    .sort((a, b) => re[a] - re[b]);
  const open = new Set(order);
  const clusters: number[][] = [];
  for (const seed of order) {
    if (!open.delete(seed)) continue;
    const cluster = [seed];
    for (let k = 0; k < cluster.length; k++) {
      for (const j of open) {
        if (Math.hypot(re[j] - re[cluster[k]], im[j] - im[cluster[k]]) > width) continue;
        open.delete(j);
        cluster.push(j);
      }
    }
    if (cluster.length > 1) clusters.push(cluster);
  }
  return clusters;
}

/** Y ← Y G⁻ᴴ with G = YᴴX of the cluster's columns. */
function matchCluster(cluster: readonly number[], right: ComplexMatrix, left: ComplexMatrix): boolean {
  const k = cluster.length;
  const n = right.rows;
  const gram = complexZeros(k, k);
  const adjoint = complexZeros(k, n);
  cluster.forEach((b, col) => {
    cluster.forEach((a, row) => {
      let re = 0;
      let im = 0;
      for (let i = 0; i < n; i++) {
        const [p, q] = [i + a * n, i + b * n];
        re += left.re[p] * right.re[q] + left.im[p] * right.im[q];
        im += left.re[p] * right.im[q] - left.im[p] * right.re[q];
      }
      gram.re[row + col * k] = re;
      gram.im[row + col * k] = im;
    });
    for (let i = 0; i < n; i++) {
      adjoint.re[col + i * k] = left.re[i + b * n];
      adjoint.im[col + i * k] = -left.im[i + b * n];
    }
  });
  const lu = factorDenseComplex(gram);
  if (!(lu.pivotRatio > 1e-14)) return false;
  lu.solveInPlace(adjoint);
  cluster.forEach((a, row) => {
    for (let i = 0; i < n; i++) {
      left.re[i + a * n] = adjoint.re[row + i * k];
      left.im[i + a * n] = -adjoint.im[row + i * k];
    }
  });
  return true;
}
