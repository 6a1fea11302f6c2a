import { Command } from "commander";
import {
  designOptions,
  type GivenOptions,
  outputOptions,
  runCommand,
  seedOption,
  threadsOption,
  vectorsOption,
} from "./options.js";

/** `tune`: the best design within the limits. */
export const tuneCommand = (): Command => {
  const command = new Command("tune")
    .summary("which design within the budget has the most margin?")
    .description(
      "Search the design box for the largest margin within the limits, and judge the best design on the full " +
        "model. Ctrl-C keeps the best so far.",
    )
    .argument("<problem>", "problem file (JSON)")
    .addHelpText(
      "after",
      `
Examples:
  dampwright tune ring-brake/ring-brake.json
  dampwright tune ring-brake/ring-brake.json --seed 7 --out results/seventh`,
    )
    .action((problem: string, options: GivenOptions) => runCommand("tune", problem, options));
  const options = [seedOption(), ...designOptions(), vectorsOption(), threadsOption(), ...outputOptions()];
  for (const option of options) command.addOption(option);
  return command;
};
