import { expect, it, vi } from "vitest";
import type { Problem } from "../../src/problem/problem.js";
import { Follower } from "../../src/tuning/follower.js";
import { Session } from "../../src/tuning/session.js";
import { diagonal, formula, problemOf } from "./model-cases.js";

const names = ["c", "k"];

/**
 * Two modes at 1 and about 2 rad/s; a dashpot from −0.05 on both and a spring on the second are to be chosen. Besides
 * `quiet` stiff dofs that only make the model large.
 */
function problem(quiet: number): Problem {
  const besides = (value: number) => new Array<number>(quiet).fill(value);
  const plain = problemOf({
    mass: diagonal([1, 1, ...besides(1)]),
    damping: diagonal([1, 1, ...besides(100)]),
    stiffness: diagonal([1, 4, ...besides(1e4)]),
    circulatory: diagonal([0, 1, ...besides(0)]),
    // Margins of one and more: they count by their own size.
    left: [[0.01, 0], [0, 0.01], ...besides(0).map(() => [0, 0])],
    right: [
      [1, 0, ...besides(0)],
      [0, 1, ...besides(0)],
    ],
  });
  const factors = new Map([
    ["damping", "0.1*c - 0.05"],
    ["circulatory", "k"],
  ]);
  return {
    ...plain,
    terms: plain.terms.map((term) => ({ ...term, factor: formula(factors.get(term.group) ?? 1, names) })),
    design: names.map((name) => ({ name, low: 0, high: 1, start: 1, step: null, unit: "" })),
  };
}

function follower(quiet = 40) {
  const session = new Session(problem(quiet), new Map(names.map((name) => [name, 1])));
  const searches = vi.spyOn(session, "estimate");
  const following = new Follower(session, new Map());
  const at = (x: readonly number[]) => following.at(x, session.designs.valuesOf(x));
  return { session, searches, following, at };
}

it("near a design that was searched its peaks are followed, to the values of a search", () => {
  const { session, searches, at } = follower();
  const other = follower().session;
  at([0.9, 0.5]);
  for (const x of [
    [0.91, 0.5],
    [0.88, 0.53],
    [0.9, 0.5],
  ]) {
    const found = at(x);
    expect(searches).toHaveBeenCalledTimes(1);
    const searched = other.estimate(session.designs.valuesOf(x), new Map());
    // Followed to 2 % of the tolerance 1e-3 of tuning.
    expect(Math.abs(found.value / searched.value - 1)).toBeLessThan(2e-5);
    expect(found.criticals).toHaveLength(searched.criticals.length);
  }
});

it("a step too far, and a value that moved much, are searched", () => {
  const { searches, at } = follower();
  at([0.9, 0.5]);
  at([0.9, 0.55]);
  expect(searches).toHaveBeenCalledTimes(2);
  // Damping 0.02 after 0.021, then 0.0175: less by more than 15 %.
  at([0.71, 0.5]);
  at([0.7, 0.5]);
  expect(searches).toHaveBeenCalledTimes(3);
  at([0.675, 0.5]);
  expect(searches).toHaveBeenCalledTimes(4);
});

it("an unstable design is searched, and so is every one near it", () => {
  const { searches, at } = follower();
  expect(at([0.49, 0.5]).value).toBeLessThan(0);
  expect(at([0.49, 0.5]).value).toBeLessThan(0);
  expect(searches).toHaveBeenCalledTimes(2);
  // Stable, but within reach of instability.
  expect(at([0.51, 0.5]).value).toBeGreaterThan(0);
  expect(at([0.49, 0.5]).value).toBeLessThan(0);
  expect(searches).toHaveBeenCalledTimes(4);
});

it("a small model is always searched", () => {
  const { searches, at } = follower(2);
  at([0.9, 0.5]);
  at([0.9, 0.5]);
  expect(searches).toHaveBeenCalledTimes(2);
});

it("a search asked for is not made twice, and is made where the peaks were followed", () => {
  const { session, searches, following, at } = follower();
  const [first, second] = [
    [0.9, 0.5],
    [0.91, 0.5],
  ];
  const found = at(first!);
  expect(following.search(first!, session.designs.valuesOf(first!))).toBe(found);
  expect(searches).toHaveBeenCalledTimes(1);
  at(second!);
  expect(searches).toHaveBeenCalledTimes(1);
  following.search(second!, session.designs.valuesOf(second!));
  expect(searches).toHaveBeenCalledTimes(2);
});
