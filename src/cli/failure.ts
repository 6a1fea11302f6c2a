import { ExpectedError, type Fault, InputError, NumericalError } from "../errors.js";

/** An error as plain data: classes do not survive the way from one thread to another. */
export type Failure =
  | { readonly kind: "input"; readonly faults: readonly Fault[] }
  | {
      readonly kind: "numerical" | "expected";
      readonly code: string;
      readonly message: string;
      readonly hint: string;
      readonly exitCode: number;
    }
  | { readonly kind: "bug"; readonly message: string; readonly stack: string };

export function failureOf(error: unknown): Failure {
  if (error instanceof InputError) return { kind: "input", faults: error.faults };
  if (isOutOfMemory(error)) return failureOf(outOfMemory());
  if (error instanceof ExpectedError) {
    const { code, message, hint, exitCode } = error;
    return {
      kind: error instanceof NumericalError ? "numerical" : "expected",
      code,
      message,
      hint,
      exitCode,
    };
  }
  if (!(error instanceof Error)) return { kind: "bug", message: `thrown: ${String(error)}`, stack: "" };
  return { kind: "bug", message: error.message, stack: error.stack ?? "" };
}

/** The error that `failureOf` took apart; a bug keeps the stack of the thread in which it happened. */
export function errorOf(failure: Failure): Error {
  if (failure.kind === "input") return new InputError(failure.faults);
  if (failure.kind === "bug") {
    const error = new Error(failure.message);
    if (failure.stack !== "") error.stack = failure.stack;
    return error;
  }
  const { code, message, hint, exitCode } = failure;
  return failure.kind === "numerical"
    ? new NumericalError(code, message, hint)
    : new ExpectedError(code, message, hint, exitCode);
}

/** The heap of a thread ran full, or a typed array or WebAssembly memory could not be had. */
export function isOutOfMemory(error: unknown): boolean {
  if (!(error instanceof Error)) return false;
  const full = "code" in error && error.code === "ERR_WORKER_OUT_OF_MEMORY";
  return full || (error instanceof RangeError && /allocation failed|could not allocate/i.test(error.message));
}

export function outOfMemory(): NumericalError {
  return new NumericalError(
    "numerical.out-of-memory",
    "the memory of this machine, or the share that Node.js may take of it, does not hold the work",
    "Narrow margin.bandHz, use a smaller model, or allow more: NODE_OPTIONS=--max-old-space-size=8192 (in MB).",
  );
}
