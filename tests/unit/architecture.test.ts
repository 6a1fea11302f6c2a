import { readdirSync, readFileSync } from "node:fs";
import { join, relative, sep } from "node:path";
import { expect, it } from "vitest";

// Who may import whom: this table is the documentation of the house.
const allowed: Record<string, readonly string[]> = {
  errors: [],
  numerics: ["errors"],
  problem: ["errors"],
  model: ["errors", "numerics", "problem"],
  structures: ["errors", "numerics", "problem", "model"],
  fullorder: ["errors", "numerics", "problem", "model"],
  reduction: ["errors", "numerics", "problem", "model", "fullorder"],
  parallel: ["errors"],
  margin: ["errors", "numerics", "problem", "model", "fullorder", "reduction", "parallel"],
  optimiser: ["errors", "numerics"],
  tuning: [
    "errors",
    "numerics",
    "problem",
    "model",
    "fullorder",
    "reduction",
    "margin",
    "optimiser",
    "parallel",
  ],
  trade: [
    "errors",
    "numerics",
    "problem",
    "model",
    "fullorder",
    "reduction",
    "margin",
    "optimiser",
    "tuning",
  ],
  report: ["errors", "model", "margin", "tuning", "trade"],
  index: ["errors", "problem", "model", "structures", "fullorder", "margin", "tuning", "trade", "report"],
};

const files = readdirSync("src", { recursive: true, encoding: "utf8" }).filter((f) => f.endsWith(".ts"));
const roomOf = (file: string) => file.split(sep)[0]!.replace(/\.[jt]s$/, "");

it("imports point only to folders earlier in the house", () => {
  const strays = files.flatMap((file) =>
    [...readFileSync(join("src", file), "utf8").matchAll(/from "(\.[^"]+)"/g)]
      .map((match) => roomOf(relative("src", join("src", file, "..", match[1]!))))
      .filter(
        (room) => room !== roomOf(file) && roomOf(file) !== "cli" && !allowed[roomOf(file)]?.includes(room),
      )
      .map((room) => `${file} imports ${room}`),
  );
  expect(strays).toEqual([]);
});

it("only problem, trade and cli touch files, and only cli reads the process or prints", () => {
  const strays = files.filter((file) => {
    const text = readFileSync(join("src", file), "utf8");
    const touchesFiles = /from "node:fs/.test(text) && !["problem", "trade", "cli"].includes(roomOf(file));
    const asksProcess = /\bprocess\.|\bconsole\./.test(text) && roomOf(file) !== "cli";
    // The compiled kernels lie in files, and a variable of the environment may force one.
    return (touchesFiles || asksProcess) && file !== join("numerics", "kernels", "kernel.ts");
  });
  expect(strays).toEqual([]);
});
