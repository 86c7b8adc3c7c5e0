import { Command } from "commander";
import { adoptCommand } from "./adopt.ts";
import { armCommand } from "./arm.ts";
import { checkCommand } from "./check.ts";
import { darkCommand } from "./dark.ts";
import { demoCommand } from "./demo.ts";
import { exportCommand } from "./export.ts";
import { listenCommand } from "./listen.ts";
import { openCommand } from "./open.ts";
import { portsCommand } from "./ports.ts";
import { resetCommand } from "./reset.ts";
import { runCommand } from "./run.ts";
import { EXIT, Trouble } from "./say.ts";
import { setCommand } from "./set.ts";
import { statusCommand } from "./status.ts";

const program = new Command("beamsitter")
  .description(
    "Supervises a bench laser built round a laser diode: limits, watches, records, explains.\n" +
      "Not a certified safety function: hardware interlocks and your laser safety officer come first.",
  )
  .helpCommand("help [command]", "explain a command")
  .showHelpAfterError("(beamsitter --help lists the commands)")
  .addHelpText(
    "after",
    `
Exit codes: 0 done, 1 refused or a problem found, 2 command line, 3 no daemon, 4 port, folder or file.

Examples:
  beamsitter check bench.yaml          is the bench file sound, and what would be wiser
  beamsitter run --bench bench.yaml    supervise it, in the foreground
  beamsitter arm 1.2A                  light on, deliberately
  beamsitter dark                      light off, now`,
  )
  .exitOverride();

for (const command of [
  checkCommand(),
  runCommand(),
  demoCommand(),
  openCommand(),
  statusCommand(),
  armCommand(),
  setCommand(),
  darkCommand(),
  resetCommand(),
  adoptCommand(),
  portsCommand(),
  listenCommand(),
  exportCommand(),
]) {
  command.exitOverride();
  program.addCommand(command);
}

try {
  await program.parseAsync(process.argv);
} catch (error) {
  process.exitCode = report(error);
}

/** Prints what went wrong and what to do; returns the exit code. */
function report(error: unknown): number {
  if (error instanceof Trouble) {
    process.stderr.write(`${error.message}\n${error.remedy}\n`);
    return error.exit;
  }
  // commander has already written its own sentence; help and version are no errors.
  const code = (error as { code?: unknown } | null)?.code;
  if (typeof code === "string" && code.startsWith("commander.")) {
    return code === "commander.help" || code === "commander.helpDisplayed" ? EXIT.done : EXIT.usage;
  }
  throw error;
}
