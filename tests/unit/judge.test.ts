import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, expect, it, vi } from "vitest";
import { readProblem } from "../../src/problem/read-problem.js";
import { judge } from "../../src/tuning/judge.js";
import { Session } from "../../src/tuning/session.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-judge-"));
afterAll(() => rmSync(folder, { recursive: true }));

/** One mass, c = 1 N s/m, spring load·100 N/m: the radius c √(4k − c²) / 2 is smallest at load 0.5. */
async function session(): Promise<Session> {
  const path = join(folder, "problem.json");
  const content = {
    format: "dampwright/1",
    dofs: 1,
    matrices: { unit: { entries: [[1, 1, 1]] } },
    envelope: { load: { range: [0.5, 1.5] } },
    terms: {
      mass: [{ matrix: "unit" }],
      damping: [{ matrix: "unit" }],
      stiffness: [{ matrix: "unit", factor: "100*load" }],
    },
    perturbations: [{ acts: "stiffness", kind: "complex", left: "identity", right: "identity" }],
  };
  writeFileSync(path, JSON.stringify(content));
  return new Session(await readProblem(path), new Map());
}

it("a corner that the full model finds lower wins against a reduced model that swears by another", async () => {
  const mistaken = await session();
  // A search over the envelope that always ends at the wrong corner, and below what is true anywhere.
  vi.spyOn(mistaken, "worstPoints").mockReturnValue([{ at: new Map([["load", 1.5]]), value: 1 }]);
  const { at, point, doubts } = await judge(mistaken, new Map(), undefined, [], () => undefined);
  expect(at.get("load")).toBe(0.5);
  // Settled to 1e-6, and exact on one dof.
  expect(point.value).toBeCloseTo(Math.sqrt(4 * 50 - 1) / 2, 8);
  expect(doubts).toEqual([]);
});
