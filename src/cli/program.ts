import { Command } from "commander";
import { checkCommand } from "./check.js";
import { machineCommand } from "./machine.js";
import { marginCommand } from "./margin.js";
import { sampleCommand } from "./sample.js";
import { tuneCommand } from "./tune.js";
import { version } from "./version.js";

const nextSteps = `
To see it work:
  dampwright sample ring-brake --out ring-brake
  dampwright check ring-brake/ring-brake.json
  dampwright tune ring-brake/ring-brake.json

Exit status: 0 answered, 1 target missed or model unsound, 2 bad input,
3 not to be trusted, 70 a fault of ours, 130 interrupted.`;

/** The command line: its commands, and errors thrown instead of ending the process. */
export function buildProgram(): Command {
  const program = new Command("dampwright")
    .description(
      "Robust stability margins and damping design for machines in which friction or a flow feeds vibration.",
    )
    .version(version)
    .addHelpText("after", nextSteps);
  const commands = [checkCommand(), marginCommand(), tuneCommand(), sampleCommand(), machineCommand()];
  for (const command of commands) program.addCommand(command);
  for (const command of [program, ...program.commands]) {
    command.exitOverride().showHelpAfterError("(add --help for what there is)");
  }
  return program;
}
