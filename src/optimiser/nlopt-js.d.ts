/** The part of nlopt-js that is used here; the package ships no types of its own. */
declare module "nlopt-js" {
  type Scalar = (x: number[]) => number;
  interface Optimiser {
    setMaxObjective(f: Scalar, tolerance: number): void;
    addInequalityConstraint(f: Scalar, tolerance: number): void;
    setLowerBounds(bounds: readonly number[]): void;
    setUpperBounds(bounds: readonly number[]): void;
    setMaxeval(count: number): void;
    optimize(start: readonly number[]): { success: boolean; x: number[]; value: number };
  }
  const nlopt: {
    readonly ready: Promise<void>;
    readonly Optimize: new (algorithm: unknown, dimension: number) => Optimiser;
    readonly Algorithm: { readonly LN_COBYLA: unknown };
    readonly GC: { flush(): void };
  };
  // biome-ignore lint/style/noDefaultExport: the package itself has one
  export default nlopt;
}
