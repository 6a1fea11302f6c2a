import { Command } from "commander";
import { type GivenOptions, outputOptions, runCommand } from "./options.js";

/** `check`: is the file and its model sound. */
export const checkCommand = (): Command => {
  const command = new Command("check")
    .summary("is this file and its model sound?")
    .description(
      "Check a problem: sizes, symmetry, definiteness over the design box, index and regularity, and whether the " +
        "model is stable by structure without its feeding terms.",
    )
    .argument("<problem>", "problem file (JSON)")
    .addHelpText("after", "\nExample:\n  dampwright check ring-brake/ring-brake.json")
    .action((problem: string, options: GivenOptions) => runCommand("check", problem, options));
  for (const option of outputOptions()) command.addOption(option);
  return command;
};
