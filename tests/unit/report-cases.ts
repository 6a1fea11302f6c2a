/** Results with invented numbers, for the tests of their summaries. */

import { cautions, type MarginCommandResult, type TuneCommandResult } from "../../src/tuning/result.js";

export const marginCase: MarginCommandResult = {
  format: "dampwright-result/1",
  command: "margin",
  version: "0.0.0",
  title: "Slewing ring brake, second sample",
  units: { friction: "", speed: "rad/s", tailRate: "N s/m", layer: "m" },
  status: "trusted",
  doubts: [],
  warnings: ["2 unstable eigenvalues lie outside the band; the verdict is about the band only."],
  cautions,
  model: { dofs: 10005, modesCounted: 71, searchedToHz: 2600 },
  effort: {
    factorisations: 21,
    complexFactorisations: 19,
    realFactorisations: 2,
    factorisationsBeforeAudit: null,
    reducedOrder: 98,
    reducedEvaluations: 143,
    seconds: 12.3456,
  },
  inputs: [{ path: "brake.json", sha256: "00", bytes: 12 }],
  margin: {
    value: 0.83412345,
    between: [0.834123, 0.834124],
    measure: "radius",
    kind: "complex",
    lowerBound: false,
    loss: "flutter",
    breaksAtHz: 391.23456,
    at: { friction: 0.55, speed: 12.3456 },
    target: 1,
    meetsTarget: false,
  },
  measures: { multiplier: 1.2345678, dampingRatio: 0.00123456 },
  design: { tailRate: 50, layer: 0.002 },
  budget: {
    mass: { used: 0.93, limit: 12, unit: "kg" },
    cost: { used: 412.5, limit: 400, unit: "" },
  },
  unperturbed: {
    stable: true,
    unstable: 0,
    unstableOutside: 2,
    abscissa: -1.23456,
    onAxis: 0,
    leastDamped: [
      { hz: 391.3, ratio: 0.0012345 },
      { hz: 612.6, ratio: 0.0023456 },
    ],
    examined: 3,
  },
  competing: [
    { hz: 391.23456, value: 0.83412345 },
    { hz: 612.6, value: 0.95 },
  ],
  witness: { residual: 3.21e-15, size: 0.834124 },
  audit: {
    worst: 2.1e-9,
    evaluations: 12,
    frequenciesHz: [],
    envelope: [{ at: { friction: 0.2 }, value: 1.3 }],
    levelSetClean: true,
  },
  balance: [
    { name: "background", group: "damping", power: 0.94 },
    { name: "loss of layer", group: "damping", power: 0.052 },
    { name: "tail", group: "damping", power: 0.008 },
    { name: "rub", group: "circulatory", power: -0.87 },
    { name: "declared error", group: "model error", power: -0.13 },
  ],
  convergence: [],
};

export const tuneCase: TuneCommandResult = {
  ...marginCase,
  command: "tune",
  warnings: [],
  margin: {
    ...marginCase.margin,
    value: 1.0312345,
    between: [1.03123, 1.03124],
    breaksAtHz: 612.6,
    meetsTarget: true,
  },
  unperturbed: { ...marginCase.unperturbed, unstableOutside: 0 },
  design: { tailRate: 612.3456, layer: 0.0035 },
  budget: {
    mass: { used: 11.99, limit: 12, unit: "kg" },
    cost: { used: 399.99, limit: 400, unit: "" },
  },
  effort: { ...marginCase.effort, factorisationsBeforeAudit: 17 },
  seed: 1,
  before: {
    margin: { ...marginCase.margin, value: -0.0123456, breaksAtHz: 390.6 },
    design: marginCase.design,
    budget: { ...marginCase.budget, cost: { used: 92, limit: 400, unit: "" } },
    unperturbed: { ...marginCase.unperturbed, stable: false, unstable: 1, abscissa: 3.21 },
  },
  history: [
    { round: 0, design: {}, at: {}, reduced: 1.01, full: 0.9876, factorisations: 9, reducedOrder: 90 },
    { round: 1, design: {}, at: {}, reduced: 1.0313, full: 1.0312, factorisations: 15, reducedOrder: 98 },
  ],
  starts: [
    { value: 1.04, design: {} },
    { value: 0.9123, design: {} },
  ],
  rounded: true,
};
