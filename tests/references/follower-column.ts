/** A clamped column of cubic Hermite elements under a unit end load that follows its tip; EI = ρA = L = 1. */

export interface Column {
  readonly M: number[][];
  readonly K: number[][];
  readonly N: number[][];
}

const square = (n: number): number[][] => Array.from({ length: n }, () => new Array<number>(n).fill(0));

/**
 * Each node has a deflection and a slope, those of the clamped end left out. N is minus the geometric stiffness of a
 * unit compression, plus the transverse part of the follower force: −P w′(1) does work on w(1).
 */
export function followerColumn(elements: number): Column {
  const l = 1 / elements;
  const bending = [
    [12, 6 * l, -12, 6 * l],
    [6 * l, 4 * l * l, -6 * l, 2 * l * l],
    [-12, -6 * l, 12, -6 * l],
    [6 * l, 2 * l * l, -6 * l, 4 * l * l],
  ];
  const inertia = [
    [156, 22 * l, 54, -13 * l],
    [22 * l, 4 * l * l, 13 * l, -3 * l * l],
    [54, 13 * l, 156, -22 * l],
    [-13 * l, -3 * l * l, -22 * l, 4 * l * l],
  ];
  const geometric = [
    [36, 3 * l, -36, 3 * l],
    [3 * l, 4 * l * l, -3 * l, -l * l],
    [-36, -3 * l, 36, -3 * l],
    [3 * l, -l * l, -3 * l, 4 * l * l],
  ];
  const size = 2 * elements + 2;
  const [M, K, N] = [square(size), square(size), square(size)];
  for (let e = 0; e < elements; e++) {
    for (let i = 0; i < 4; i++) {
      for (let j = 0; j < 4; j++) {
        M[2 * e + i]![2 * e + j]! += (inertia[i]![j]! * l) / 420;
        K[2 * e + i]![2 * e + j]! += bending[i]![j]! / l ** 3;
        N[2 * e + i]![2 * e + j]! -= geometric[i]![j]! / (30 * l);
      }
    }
  }
  N[size - 2]![size - 1]! += 1;
  const free = (a: number[][]) => a.slice(2).map((row) => row.slice(2));
  return { M: free(M), K: free(K), N: free(N) };
}
