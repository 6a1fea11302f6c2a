import { readFileSync } from "node:fs";
import { join, resolve } from "node:path";
import { afterEach, describe, expect, it } from "vitest";
import { newFolder, run } from "./command-line.js";

const variable = "DAMPWRIGHT_KERNEL";
const asked = process.env[variable];

afterEach(() => {
  if (asked === undefined) delete process.env[variable];
  else process.env[variable] = asked;
});

describe("the kernel in use", () => {
  it("is shown, and follows the environment variable", async () => {
    for (const name of ["fma", "simd", "plain"]) {
      process.env[variable] = name;
      const { status, stdout } = await run(["machine"], newFolder());
      expect(status).toBe(0);
      expect(stdout).toMatch(new RegExp(`^ {2}kernel {4}${name}, `));
      expect(stdout).toMatch(/threads +\d+\n/);
    }
  });

  it("must be a known one, in every command", async () => {
    process.env[variable] = "abacus";
    const oscillator = resolve("problems/friction-oscillator/friction-oscillator.json");
    for (const args of [["machine"], ["margin", oscillator, "--quiet"]]) {
      const { status, stderr } = await run(args, newFolder());
      expect(status).toBe(2);
      expect(stderr).toContain('DAMPWRIGHT_KERNEL: there is no kernel "abacus"');
      expect(stderr).toContain("fma, simd, plain, blas");
    }
  });
});

/** What was computed, without what depends on the clock. */
function resultIn(folder: string): Record<string, unknown> {
  const { effort, ...rest } = JSON.parse(readFileSync(join(folder, "result.json"), "utf8"));
  return { ...rest, effort: { ...effort, seconds: 0 } };
}

async function withThreads(threads: number, args: readonly string[]): Promise<Record<string, unknown>> {
  const folder = newFolder();
  const options = ["--threads", String(threads), "--out", folder, "--quiet"];
  const { status, stderr } = await run([...args, ...options], folder);
  expect(stderr).toBe("");
  expect([0, 1]).toContain(status);
  return resultIn(folder);
}

describe("the number of threads", () => {
  it("does not change a digit of a tuned design", async () => {
    const args = ["tune", resolve("problems/friction-oscillator/friction-oscillator.json")];
    expect(await withThreads(3, args)).toEqual(await withThreads(1, args));
  });

  it("does not change a digit of a margin whose evidence is gathered in threads", async () => {
    const folder = newFolder();
    // Large enough for threads (crews.ts).
    await run(["sample", "ring-brake", "--dofs", "2400", "--out", "."], folder);
    const args = ["margin", join(folder, "ring-brake.json"), "--at", "friction=0.5"];
    const two = await withThreads(2, args);
    expect(two).toEqual(await withThreads(1, args));
  });
});
