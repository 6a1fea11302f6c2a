/**
 * The few errors of this program. Everything a user can mend is an `ExpectedError`
 * with a remedy; anything else thrown is our own bug and shows its stack.
 */

/** One fault in a user's file: where, what stands there, what belongs there, one thing to do. */
export interface Fault {
  /** Stable identifier that scripts and tests match, e.g. `input.unknown-key`. */
  readonly code: string;
  /** File and place, e.g. `brake.json /terms/mass/0/matrix` or `ring.mtx:12`. */
  readonly at: string;
  readonly message: string;
  readonly hint: string;
}

/** An error that the user can mend. `exitCode` is the status with which the command line ends. */
export class ExpectedError extends Error {
  readonly code: string;
  readonly hint: string;
  readonly exitCode: number;

  constructor(code: string, message: string, hint: string, exitCode: number) {
    super(message);
    this.name = new.target.name;
    this.code = code;
    this.hint = hint;
    this.exitCode = exitCode;
  }
}

/** Bad input: carries every fault found, exit status 2. */
export class InputError extends ExpectedError {
  readonly faults: readonly Fault[];

  constructor(faults: readonly Fault[]) {
    const first = faults[0];
    if (first === undefined) throw new Error("an InputError needs at least one fault");
    super(first.code, faults.map((f) => `${f.at}: ${f.message}\n  ${f.hint}`).join("\n"), first.hint, 2);
    this.faults = faults;
  }

  static of(code: string, at: string, message: string, hint: string): InputError {
    return new InputError([{ code, at, message, hint }]);
  }
}

/** Numbers that could not be trusted or computed: exit status 3. */
export class NumericalError extends ExpectedError {
  constructor(code: string, message: string, hint: string) {
    super(code, message, hint, 3);
  }
}

/** Guards an assumption of our own; failing it is a bug of this program. */
export function invariant(condition: boolean, message: string): asserts condition {
  if (!condition) throw new Error(`invariant violated: ${message}`);
}
