/**
 * Work that may be spread over threads. A table names the tasks; each takes what all workers
 * hold and an input, and must give the same output whoever runs it, so that results depend on
 * neither the number of threads nor their timing.
 */

/** Tasks by name. */
export type TaskTable<Held> = Readonly<Record<string, (held: Held, input: never) => unknown>>;

type InputOf<Task> = Task extends (held: never, input: infer Input) => unknown ? Input : never;
type OutputOf<Task> = Task extends (held: never, input: never) => infer Output ? Awaited<Output> : never;

export interface Crew<Table> {
  /** Outputs in the order of the inputs. `finished` is called after each, in any order. */
  run<Name extends keyof Table>(
    name: Name,
    inputs: readonly InputOf<Table[Name]>[],
    finished?: () => void,
  ): Promise<OutputOf<Table[Name]>[]>;
}

/** Runs everything in this thread, one after the other. */
export function alone<Held, Table extends TaskTable<Held>>(table: Table, held: Held): Crew<Table> {
  return {
    run: async (name, inputs, finished) => {
      const task = table[name] as unknown as (held: Held, input: unknown) => unknown;
      const outputs: unknown[] = [];
      for (const input of inputs) {
        outputs.push(await task(held, input));
        finished?.();
      }
      return outputs as never;
    },
  };
}
