import { expect, it } from "vitest";
import { createRandom } from "../../src/numerics/random.js";

it("equal seeds give equal streams and different seeds different ones", () => {
  const draw = (seed: number) => {
    const random = createRandom(seed);
    return Array.from({ length: 20 }, () => random.uniform());
  };
  expect(draw(7)).toEqual(draw(7));
  expect(draw(7)).not.toEqual(draw(8));
});

it("uniform numbers fill [0, 1) with mean 1/2 and variance 1/12", () => {
  const random = createRandom(3);
  const draws = Array.from({ length: 20000 }, () => random.uniform());
  expect(Math.min(...draws)).toBeGreaterThanOrEqual(0);
  expect(Math.max(...draws)).toBeLessThan(1);
  const mean = draws.reduce((s, x) => s + x, 0) / draws.length;
  const variance = draws.reduce((s, x) => s + (x - mean) ** 2, 0) / draws.length;
  // Five standard deviations of the two estimates.
  expect(Math.abs(mean - 0.5)).toBeLessThan(0.0103);
  expect(Math.abs(variance - 1 / 12)).toBeLessThan(0.003);
});

it("normal numbers have mean 0, variance 1 and fourth moment 3", () => {
  const random = createRandom(4);
  const draws = Array.from({ length: 20000 }, () => random.normal());
  const moment = (p: number) => draws.reduce((s, x) => s + x ** p, 0) / draws.length;
  // Five standard deviations: 1, √2 and √96 over √20000.
  expect(Math.abs(moment(1))).toBeLessThan(0.036);
  expect(Math.abs(moment(2) - 1)).toBeLessThan(0.05);
  expect(Math.abs(moment(4) - 3)).toBeLessThan(0.35);
});

it("integers take every value below the bound, about equally often", () => {
  const random = createRandom(5);
  const counts = new Int32Array(7);
  for (let i = 0; i < 7000; i++) counts[random.integer(7)]++;
  // Five standard deviations of a binomial count with mean 1000.
  for (const count of counts) expect(Math.abs(count - 1000)).toBeLessThan(150);
});
