import { type Fault, InputError } from "../errors.js";

/** Gathers what is wrong with a problem file and the files it names, to report all of it at once. */
export class FaultList {
  private readonly path: string;
  private readonly faults: Fault[] = [];

  /** @param path - The problem file, as shown in messages. */
  constructor(path: string) {
    this.path = path;
  }

  /** @param pointer - JSON pointer into the problem file. */
  add(code: string, pointer: string, message: string, hint: string): void {
    this.faults.push({ code, at: pointer === "" ? this.path : `${this.path} ${pointer}`, message, hint });
  }

  /** Keeps the faults of an `InputError`; any other error goes on. */
  absorb(error: unknown): void {
    if (!(error instanceof InputError)) throw error;
    this.faults.push(...error.faults);
  }

  get count(): number {
    return this.faults.length;
  }

  throwIfAny(): void {
    if (this.faults.length > 0) throw new InputError(this.faults);
  }
}
