/** How a solve ended, and the limits that iterative refinement keeps. */

/** What a solve achieved. */
export interface SolveReport {
  /**
   * Backward error of the worst column, η = ‖b − A x‖ / (‖A‖ ‖x‖ + ‖b‖) in the infinity norm;
   * a few machine epsilons after a solve that behaved well, whatever the conditioning of A.
   * It is taken twice, in the given units and in those of the equilibrated system
   * (D A D)(D⁻¹ x) = D b, and the larger counts: in the given units the stiffest rows hide the others.
   *
   * Source: Rigal & Gaches, J. ACM 14(3), 1967, pp. 543–548.
   */
  readonly backwardError: number;
  /** Corrections taken. */
  readonly refinements: number;
}

/** Refinement stops below this backward error, */
export const BACKWARD_ERROR_GOAL = 1e-14;
/** after this many corrections, */
export const MOST_REFINEMENTS = 5;
/** or when a correction leaves more than this share of the error. */
export const STAGNATION = 0.5;

/** Rigal–Gaches quotient from infinity norms; 0 for an exact solution. */
export function backwardErrorOf(residual: number, normA: number, normX: number, normB: number): number {
  return residual === 0 ? 0 : residual / (normA * normX + normB);
}
