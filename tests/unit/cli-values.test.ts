import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, describe, expect, it } from "vitest";
import { exitStatus } from "../../src/cli/exit-status.js";
import type { JobRequest } from "../../src/cli/job.js";
import { parseAssignments, readDesign, resolveValues } from "../../src/cli/named-values.js";
import { barText, lineDisplay } from "../../src/cli/progress-display.js";
import { makeFolder, resultsFolder } from "../../src/cli/results-folder.js";
import { type Fault, InputError } from "../../src/errors.js";
import { marginCase } from "./report-cases.js";

const folder = mkdtempSync(join(tmpdir(), "dampwright-cli-"));
afterAll(() => rmSync(folder, { recursive: true }));

function faultsOf(action: () => unknown): readonly Fault[] {
  try {
    action();
  } catch (error) {
    if (error instanceof InputError) return error.faults;
    throw error;
  }
  return [];
}

describe("assignments", () => {
  it("are read from several lists, the last one of a name counting", () => {
    const values = parseAssignments(["a=1, b=-2e-3", "a=.5"], "--set");
    expect(values).toEqual([
      { name: "a", value: 0.5, at: "--set", typed: true },
      { name: "b", value: -0.002, at: "--set", typed: true },
    ]);
  });

  it.each(["", "a", "a=", "=1", "a=1=2", "a=0x10", "a=1e999", "a=NaN", "a=1;b=2"])(
    "refuse %j, which assigns no number",
    (text) => {
      expect(faultsOf(() => parseAssignments([text], "--at")).map(({ code }) => code)).toEqual([
        "input.assignment",
      ]);
    },
  );

  it("are refused all at once", () => {
    expect(faultsOf(() => parseAssignments(["a,b=1,c="], "--at"))).toHaveLength(2);
  });

  const declared = [
    { name: "friction", low: 0.2, high: 0.5, unit: "" },
    { name: "speed", low: 1, high: 2, unit: "rad/s" },
  ];

  it("of known names inside their ranges, ends included, are taken", () => {
    const faults: Fault[] = [];
    const given = parseAssignments(["friction=0.2,speed=2"], "--at");
    expect([...resolveValues(given, declared, "operating parameter", faults)]).toEqual([
      ["friction", 0.2],
      ["speed", 2],
    ]);
    expect(faults).toEqual([]);
  });

  it("of unknown names and values outside the range are refused with the nearest name and the range", () => {
    const faults: Fault[] = [];
    resolveValues(
      parseAssignments(["fricton=0.3,speed=3,friction=0.1"], "--at"),
      declared,
      "operating parameter",
      faults,
    );
    expect(faults.map(({ code }) => code)).toEqual(["input.unknown-name", "input.range", "input.range"]);
    expect(faults[0]?.hint).toContain('"friction"');
    expect(faults[1]?.message).toContain("[1, 2] rad/s");
  });

  const layer = { name: "layer", low: 0.1, high: 0.45, unit: "mm", step: 0.1 };
  const layerOf = (value: number, typed: boolean, faults: Fault[]) =>
    resolveValues([{ name: "layer", value, at: "--set", typed }], [layer], "design variable", faults);

  it("off the steps of a variable are refused with the two nearest, or the one in the range", () => {
    for (const [value, hint] of [
      [0.25, "Use 0.2 or 0.3 mm."],
      [0.45, "Use 0.4 mm."],
    ] as const) {
      const faults: Fault[] = [];
      layerOf(value, true, faults);
      expect(faults).toMatchObject([{ code: "input.step", at: "--set", hint }]);
    }
  });

  it("on a step that binary numbers cannot hold are taken, and any value that a result has", () => {
    const faults: Fault[] = [];
    // 0.30000000000000004 = 0.1 + 0.2.
    expect(layerOf(0.1 + 2 * 0.1, true, faults).size).toBe(1);
    expect(layerOf(0.25, false, faults).size).toBe(1);
    expect(faults).toEqual([]);
  });

  it("have nothing to name where the problem declares nothing", () => {
    const faults: Fault[] = [];
    resolveValues(parseAssignments(["a=1"], "--at"), [], "operating parameter", faults);
    expect(faults[0]?.hint).toBe("The problem has no operating parameter.");
  });
});

describe("the design of a result file", () => {
  const write = (text: string) => {
    const path = join(folder, "result.json");
    writeFileSync(path, text);
    return path;
  };

  it("is read with the place of each value", async () => {
    const path = write('{"design":{"layer":0.002},"status":"trusted"}');
    expect(await readDesign(path)).toEqual([
      { name: "layer", value: 0.002, at: `${path} /design/layer`, typed: false },
    ]);
  });

  it.each([
    ["{", "input.json-syntax"],
    ["[]", "input.design-missing"],
    ['{"design":[1]}', "input.design-missing"],
    ['{"design":{"layer":"thick"}}', "input.design-value"],
  ])("is refused in %s", async (text, code) => {
    await expect(readDesign(write(text))).rejects.toMatchObject({ code });
  });

  it("is missed with the path where there is no such file", async () => {
    await expect(readDesign(join(folder, "none.json"))).rejects.toMatchObject({ code: "input.file-missing" });
  });
});

describe("the exit status", () => {
  const { margin } = marginCase;
  const open = (low: number | null, high: number | null) => ({ ...margin, between: [low, high] as const });
  const free = { ...margin, target: null, meetsTarget: null };
  it.each([
    ["target reached", { status: "trusted", margin: { ...margin, meetsTarget: true } }, 0],
    ["target missed", { status: "trusted", margin }, 1],
    ["nothing found to break", { status: "trusted", margin: { ...margin, value: null } }, 0],
    ["no target, positive radius", { status: "trusted", margin: { ...free, value: 0.1 } }, 0],
    ["no target, negative radius", { status: "trusted", margin: { ...free, value: -0.1 } }, 1],
    ["no target, small multiplier", { status: "trusted", margin: { ...free, measure: "multiplier" } }, 1],
    ["untrusted, target reached", { status: "untrusted", margin: { ...margin, meetsTarget: true } }, 3],
    ["a bracket open around the target", { status: "bracket-open", margin: open(0.5, 1.5) }, 3],
    ["a bracket open above the target", { status: "bracket-open", margin: open(1, null) }, 0],
    ["a bracket open below the target", { status: "bracket-open", margin: open(null, 0.9) }, 1],
    ["a bracket without ends", { status: "bracket-open", margin: open(null, null) }, 3],
    [
      "a multiplier's bracket around 1",
      { status: "bracket-open", margin: { ...open(0.5, 2), target: null, measure: "multiplier" } },
      3,
    ],
    ["infeasible", { status: "infeasible", margin: { ...margin, meetsTarget: true } }, 1],
    ["a sound model", { status: "trusted" }, 0],
    ["an unsound model", { status: "unsound" }, 1],
    ["interrupted", { status: "interrupted", margin: { ...margin, meetsTarget: true } }, 130],
  ] as const)("of %s", (_, answer, expected) => {
    expect(exitStatus(answer)).toBe(expected);
  });
});

describe("the results folder", () => {
  const request: JobRequest = {
    command: "margin",
    problem: "machines/brake.json",
    version: "1",
    design: [{ name: "layer", value: 1, at: "--set", typed: true }],
    at: [],
    seed: null,
    threads: 1,
  };
  const inputs = [{ path: "brake.json", sha256: "ab", bytes: 2 }];

  it("is named after the problem, the command and ten digits of a hash", () => {
    expect(resultsFolder(request, inputs)).toMatch(/^results[\\/]brake[\\/]margin-[0-9a-f]{10}$/);
  });

  it("is the same for the same question however it was asked, and another for another", () => {
    const same = {
      ...request,
      design: [{ name: "layer", value: 1, at: "old.json /design/layer", typed: false }],
    };
    expect(resultsFolder(same, inputs)).toBe(resultsFolder(request, inputs));
    const others = [
      resultsFolder({ ...request, design: [] }, inputs),
      resultsFolder({ ...request, at: request.design }, inputs),
      resultsFolder({ ...request, seed: 1 }, inputs),
      resultsFolder({ ...request, version: "2" }, inputs),
      resultsFolder(request, [{ ...inputs[0], sha256: "cd" }]),
    ];
    expect(new Set([resultsFolder(request, inputs), ...others]).size).toBe(6);
  });

  it("cannot stand below a file", () => {
    writeFileSync(join(folder, "file"), "");
    expect(faultsOf(() => makeFolder(join(folder, "file", "below"))).map(({ code }) => code)).toEqual([
      "output.unwritable",
    ]);
  });
});

describe("progress", () => {
  it("without a terminal is a line as a stage begins and one every two seconds at most", () => {
    const lines: string[] = [];
    let time = 0;
    const { show } = lineDisplay({ write: (text) => lines.push(text) }, () => time);
    for (const [at, stage, done, total] of [
      [0, "screening", 0, 9],
      [1900, "screening", 1, 9],
      [2000, "screening", 2, 9],
      [2100, "blinking", 0, null],
      [2300, "climbing", 0, null],
      [4300, "climbing", 3, null],
    ] as const) {
      time = at;
      show({ stage, done, total });
    }
    expect(lines).toEqual(["screening 0/9\n", "screening 2/9\n", "climbing\n", "climbing 3\n"]);
  });

  it("on a terminal is a bar where the length is known", () => {
    expect(barText({ stage: "screening", done: 12, total: 24 }, 1600)).toBe(
      "████████████░░░░░░░░░░░░ screening 12/24, 2 s",
    );
    expect(barText({ stage: "building", done: 0, total: null }, 0)).toBe("building, 0 s");
  });
});
