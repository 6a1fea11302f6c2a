/** What one solver did on one model: a child process prints it as JSON, the parent as a line of a table. */
export interface Row {
  /** Seconds for the ordering and symbolic analysis; null when the solver does not tell them apart. */
  readonly orderingS: number | null;
  /** Seconds of each numeric factorisation. */
  readonly factorS: readonly number[];
  /** Seconds of one solve with one right-hand side, least of several. */
  readonly solveOneS: number;
  /** Seconds per right-hand side of one solve with a block of them. */
  readonly solveBlockS: number;
  /** Peak of factors and work space by the solver's own account [B]. */
  readonly bytes: number | null;
  /** Rise of the process's peak resident memory over what it held before the ordering [B]. */
  readonly residentBytes: number;
  /** Entries of L and U. */
  readonly stored: number;
  /** Real floating-point operations of one factorisation. */
  readonly operations: number;
  /** Worst ‖b − A x‖ / (‖A‖ ‖x‖ + ‖b‖) of the block, infinity norms, given units. */
  readonly backwardError: number;
  /** Anything else worth a word, e.g. an inertia. */
  readonly remark: string;
}

/** A solver that could not be run, and why. */
export interface Absence {
  readonly absent: string;
}

export type Outcome = Row | Absence;

/** Right-hand sides of the block. */
export const BLOCK = 12;
