import type { Command } from "commander";
import { importCommand } from "./sessions-import.ts";
import { noteCommand, tagCommand } from "./sessions-keep.ts";
import { packCommand, unpackCommand } from "./sessions-pack.ts";
import { listAction, showCommand, verifyCommand } from "./sessions-read.ts";
import { retireCommand } from "./sessions-retire.ts";
import { recordCommandOf } from "./sessions-where.ts";

/** `sessions`: the list, and all that is done with single sessions. */
export function sessionsCommand(): Command {
  const sessions = recordCommandOf(
    "sessions",
    "the recorded sessions: when, how long, current, change of output, trips, notes",
    ["sessions", "sessions --on north --json", "sessions show 4", "sessions pack night.bsp"],
  )
    .option("--last <number>", "how many of the newest, 30 where left out")
    // An option behind a part's name is that part's.
    .enablePositionalOptions()
    .action(listAction);
  for (const part of [
    showCommand(),
    noteCommand(),
    tagCommand(),
    verifyCommand(),
    packCommand(),
    unpackCommand(),
    importCommand(),
    retireCommand(),
  ]) {
    sessions.addCommand(part);
  }
  return sessions;
}
