import { readFileSync } from "node:fs";
import { join } from "node:path";
import { Command } from "commander";
import { z } from "zod";
import { packageRoot } from "../paths.ts";
import { adoptCommand } from "./adopt.ts";
import { armCommand } from "./arm.ts";
import { changeCommand } from "./change.ts";
import { checkCommand } from "./check.ts";
import { darkCommand } from "./dark.ts";
import { demoCommand } from "./demo.ts";
import { exportCommand } from "./export.ts";
import { initCommand } from "./init.ts";
import { listenCommand } from "./listen.ts";
import { openCommand } from "./open.ts";
import { portsCommand } from "./ports.ts";
import { readingCommand } from "./reading.ts";
import { resetCommand } from "./reset.ts";
import { runCommand } from "./run.ts";
import { EXIT, Trouble } from "./say.ts";
import { sessionsCommand } from "./sessions.ts";
import { setCommand } from "./set.ts";
import { statusCommand } from "./status.ts";

const EXAMPLES = `
Examples:
  beamsitter check bench.yaml          is the bench file sound, and what would be wiser
  beamsitter run --bench bench.yaml    supervise it, in the foreground
  beamsitter arm 1.2A                  light on, deliberately
  beamsitter dark                      light off, now`;

/** The command line, made anew for each use: commander keeps what it parsed. */
export function makeProgram(): Command {
  const program = new Command("beamsitter")
    .description(
      "Supervises a bench laser built round a laser diode: limits, watches, records, explains.\n" +
        "Not a certified safety function: hardware interlocks and your laser safety officer come first.",
    )
    .helpCommand("help [command]", "explain a command")
    .version(versionOf(), "--version", "print the version")
    .addHelpText("after", EXAMPLES)
    .addHelpText(
      "afterAll",
      "\nExit codes: 0 done, 1 refused or a problem found, 2 command line, 3 no daemon, 4 port, folder or file.",
    )
    // An option behind a command's name is that command's, also where the command has parts.
    .enablePositionalOptions()
    .exitOverride();
  for (const command of [
    initCommand(),
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
    changeCommand(),
    readingCommand(),
    portsCommand(),
    listenCommand(),
    exportCommand(),
    sessionsCommand(),
  ]) {
    settle(command, command.name());
    for (const part of command.commands) settle(part, `${command.name()} ${part.name()}`);
    program.addCommand(command);
  }
  return program.showHelpAfterError("(beamsitter --help lists the commands)");
}

/** What holds for every command, and for the parts of one that has parts. */
function settle(command: Command, name: string): void {
  refuseRepeats(command);
  command
    .showHelpAfterError(`(beamsitter ${name} --help explains it; nothing was changed)`)
    .exitOverride();
}

/** The version of this package, as its own file says. */
function versionOf(): string {
  const text = readFileSync(join(packageRoot, "package.json"), "utf8");
  return z.object({ version: z.string() }).parse(JSON.parse(text)).version;
}

/** An option given twice leaves open which one is meant; commander would take the last. */
function refuseRepeats(command: Command): void {
  for (const option of command.options) {
    let given = false;
    command.on(`option:${option.name()}`, () => {
      if (given) {
        throw new Trouble(
          `${option.long} stands twice.`,
          "Say it once. Nothing was changed.",
          EXIT.usage,
        );
      }
      given = true;
    });
  }
}
