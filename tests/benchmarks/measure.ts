/**
 * Child process: measures our own solver on one model and prints a `Row`, or why the kernel is absent.
 * Arguments: shape, dofs, seed, `complex` or `symmetric`. The kernel is chosen by DAMPWRIGHT_KERNEL.
 */

import { InputError } from "../../src/errors.js";
import {
  type ComplexMatrix,
  complexZeros,
  type DenseMatrix,
  zeros,
} from "../../src/numerics/dense/matrix.js";
import { createRandom } from "../../src/numerics/random.js";
import { analyse, type SymbolicAnalysis } from "../../src/numerics/sparse/analysis.js";
import { factorComplex } from "../../src/numerics/sparse/complex-lu.js";
import { factorSymmetric } from "../../src/numerics/sparse/symmetric-ldl.js";
import { type BenchmarkModel, benchmarkModel, shapeNamed } from "./models.js";
import { complexBackwardError } from "./residual.js";
import { BLOCK, type Outcome, type Row } from "./row.js";

function complexRow({ pattern, groups, dynamic }: BenchmarkModel): Row {
  const residentBefore = process.memoryUsage.rss();
  const [analysis, orderingS] = timed(() => analyse(pattern, groups));
  const factor = () => factorComplex(analysis, pattern, dynamic);
  const [factorisation, first] = timed(factor);
  const given = randomComplex(pattern.rows, BLOCK);
  const solveOneS = leastSolve(() => complexColumns(given, 1), factorisation.solveInPlace);
  const solveBlockS = leastSolve(() => complexColumns(given, BLOCK), factorisation.solveInPlace) / BLOCK;
  const residentBytes = peakResident() - residentBefore;
  const x = complexColumns(given, BLOCK);
  const { refinements } = factorisation.solveInPlace(x);
  return {
    orderingS,
    // Released as the program does it, so that the next one finds memory.
    factorS: [first, ...repeated(() => factor().release(), first)],
    solveOneS,
    solveBlockS,
    bytes: 16 * (factorisation.nonzeros + analysis.largestFront ** 2 + analysis.stackPeak),
    residentBytes,
    stored: factorisation.nonzeros,
    operations: 8 * updates(analysis),
    backwardError: complexBackwardError(pattern, dynamic, x, given),
    remark: `${refinements} refinements, ${factorisation.negligiblePivots} negligible pivots`,
  };
}

function symmetricRow({ pattern, groups, undamped }: BenchmarkModel): Row {
  const residentBefore = process.memoryUsage.rss();
  const [analysis, orderingS] = timed(() => analyse(pattern, groups));
  const factor = () => factorSymmetric(analysis, pattern, undamped.values);
  const [factorisation, first] = timed(factor);
  const given = randomReal(pattern.rows, BLOCK);
  const solveOneS = leastSolve(() => realColumns(given, 1), factorisation.solveInPlace);
  const solveBlockS = leastSolve(() => realColumns(given, BLOCK), factorisation.solveInPlace) / BLOCK;
  const residentBytes = peakResident() - residentBefore;
  const x = realColumns(given, BLOCK);
  factorisation.solveInPlace(x);
  const { negative, zero, positive } = factorisation.inertia;
  const complex = (a: DenseMatrix): ComplexMatrix => ({
    ...a,
    re: a.values,
    im: new Float64Array(a.values.length),
  });
  const values = { re: undamped.values, im: new Float64Array(undamped.values.length) };
  return {
    orderingS,
    // Released as the program does it, so that the next one finds memory.
    factorS: [first, ...repeated(() => factor().release(), first)],
    solveOneS,
    solveBlockS,
    bytes: 8 * (factorisation.nonzeros + analysis.largestFront ** 2 + analysis.stackPeak),
    residentBytes,
    stored: factorisation.nonzeros,
    operations: updates(analysis),
    backwardError: complexBackwardError(pattern, values, complex(x), complex(given)),
    remark: `inertia ${negative} −, ${zero} 0, ${positive} +${factorisation.inertiaReliable ? "" : ", not reliable"}`,
  };
}

/** Multiply–add pairs of an LU: half as many are an LDLᵀ, whose pair counts two operations. */
function updates({ fronts, pivotStart, belowStart }: SymbolicAnalysis): number {
  let sum = 0;
  for (let s = 0; s < fronts; s++) {
    const pivots = pivotStart[s + 1] - pivotStart[s];
    const below = belowStart[s + 1] - belowStart[s];
    for (let left = below + pivots - 1; left >= below; left--) sum += left * left;
  }
  return sum;
}

/** Processor seconds: on a machine that others use too they scatter less than those of the clock. */
function timed<T>(work: () => T): [T, number] {
  const start = process.cpuUsage();
  const result = work();
  const { user, system } = process.cpuUsage(start);
  return [result, (user + system) / 1e6];
}

/** More runs while they are short: the compiler of the engine is at work in the first six or so. */
function repeated(work: () => unknown, firstS: number): number[] {
  const runs: number[] = [];
  for (let spent = firstS; runs.length < 19 && spent < 4; spent += runs[runs.length - 1])
    runs.push(timed(work)[1]);
  return runs;
}

function leastSolve<T>(right: () => T, solve: (b: T) => unknown): number {
  let least = Number.POSITIVE_INFINITY;
  for (let run = 0, spent = 0; run < 20 && spent < 2; run++) {
    const b = right();
    const seconds = timed(() => solve(b))[1];
    least = Math.min(least, seconds);
    spent += seconds;
  }
  return least;
}

function randomComplex(rows: number, cols: number): ComplexMatrix {
  const random = createRandom(2);
  const b = complexZeros(rows, cols);
  for (let i = 0; i < b.re.length; i++) {
    b.re[i] = 2 * random.uniform() - 1;
    b.im[i] = 2 * random.uniform() - 1;
  }
  return b;
}

function randomReal(rows: number, cols: number): DenseMatrix {
  return { ...zeros(rows, cols), values: randomComplex(rows, cols).re };
}

function complexColumns({ rows, re, im }: ComplexMatrix, cols: number): ComplexMatrix {
  return { rows, cols, re: re.slice(0, rows * cols), im: im.slice(0, rows * cols) };
}

function realColumns({ rows, values }: DenseMatrix, cols: number): DenseMatrix {
  return { rows, cols, values: values.slice(0, rows * cols) };
}

function peakResident(): number {
  return 1024 * process.resourceUsage().maxRSS;
}

/** What the machine refuses is no failure of the benchmark. */
function outcome(measure: () => Row): Outcome {
  try {
    return measure();
  } catch (error) {
    const fault = error instanceof InputError ? error.faults[0] : undefined;
    if (fault?.code !== "kernel.refused") throw error;
    return { absent: `${fault.message}: ${fault.hint}` };
  }
}

const [name, dofs, seed, kind] = process.argv.slice(2);
const shape = shapeNamed(name);
if (shape === undefined) throw new Error(`no shape is called ${name}`);
const model = benchmarkModel(shape, Number(dofs), Number(seed));
const measured = outcome(() => (kind === "symmetric" ? symmetricRow(model) : complexRow(model)));
process.stdout.write(JSON.stringify(measured));
