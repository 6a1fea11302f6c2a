import { availableParallelism, totalmem } from "node:os";
import { Command } from "commander";
import { hostBlas } from "../numerics/kernels/host-blas.js";
import { chosenKernel, KERNEL_VARIABLE, type KernelName } from "../numerics/kernels/kernel.js";
import { printText } from "./print.js";

const meaning: Readonly<Record<KernelName, string>> = {
  fma: "WebAssembly vectors with fused multiply-add",
  simd: "WebAssembly vectors",
  plain: "JavaScript without vectors: several times slower",
  blas: "WebAssembly, large products by the machine's OpenBLAS",
};

/** `machine`: what the computations run on. */
export const machineCommand = (): Command =>
  new Command("machine")
    .summary("what do the computations run on here?")
    .description(
      `Show the kernels in use, threads and memory. The environment variable ${KERNEL_VARIABLE} forces a kernel: ` +
        `${Object.keys(meaning).join(", ")}.`,
    )
    .action(async () => {
      const kernel = chosenKernel();
      const blas = hostBlas();
      const rows: [string, string][] = [
        ["kernel", `${kernel}, ${meaning[kernel]}`],
        [
          "OpenBLAS",
          blas === null ? "not found; not needed" : `${blas.name}; used with ${KERNEL_VARIABLE}=blas`,
        ],
        ["threads", String(availableParallelism())],
        ["memory", `${(totalmem() / 2 ** 30).toFixed(1)} GiB`],
        ["Node.js", process.version],
      ];
      await printText(`${rows.map(([name, value]) => `  ${name.padEnd(10)}${value}`).join("\n")}\n`);
    });
