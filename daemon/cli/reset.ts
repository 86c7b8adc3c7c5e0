import type { Command } from "commander";
import { askAndTell } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";

/** `reset CAUSE`: takes the latch off, by naming what it was. */
export const resetCommand = (): Command =>
  daemonCommandOf(
    "reset",
    "clear a trip by naming its cause, as status tells it; leaves the bench dark",
    ["reset permit-expired", "reset case-over --on north"],
  )
    .argument("<cause>", "identifier of the cause, for instance case-over")
    .action((cause: string, options: DaemonOptions) =>
      askAndTell(options, { verb: "reset", cause, asker: "person" }),
    );
