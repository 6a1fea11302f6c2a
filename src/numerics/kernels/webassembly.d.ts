/** The part of the WebAssembly interface that is used here; Node's own types leave it out. */

declare namespace WebAssembly {
  class Module {
    constructor(code: Uint8Array);
  }
  class Instance {
    constructor(module: Module, imports: object);
    readonly exports: object;
  }
  class Memory {
    constructor(limits: { initial: number; maximum: number });
    readonly buffer: ArrayBuffer;
    grow(pages: number): number;
  }
  function validate(code: Uint8Array): boolean;
}
