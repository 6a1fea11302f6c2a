import { Command } from "commander";
import {
  atOption,
  designOptions,
  type GivenOptions,
  outputOptions,
  runCommand,
  threadsOption,
  vectorsOption,
} from "./options.js";

/** `margin`: how much margin a design has and where it breaks first. */
export const marginCommand = (): Command => {
  const command = new Command("margin")
    .summary("how much margin does this design have, and where does it break first?")
    .description("Find the smallest margin of a design over the operating envelope, with its evidence.")
    .argument("<problem>", "problem file (JSON)")
    .addHelpText(
      "after",
      `
Examples:
  dampwright margin ring-brake/ring-brake.json
  dampwright margin ring-brake/ring-brake.json --at friction=0.5,pressure=1.2 --set bushOdd=900`,
    )
    .action((problem: string, options: GivenOptions) => runCommand("margin", problem, options));
  const options = [atOption(), ...designOptions(), vectorsOption(), threadsOption(), ...outputOptions()];
  for (const option of options) command.addOption(option);
  return command;
};
