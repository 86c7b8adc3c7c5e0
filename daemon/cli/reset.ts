import type { Command } from "commander";
import { nearest } from "../bench-file/near.ts";
import { CAUSES, causeById } from "../model/cause.ts";
import { askAndTell } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, Trouble } from "./say.ts";

/** `reset CAUSE`: takes the latch off, by naming what it was. */
export const resetCommand = (): Command =>
  daemonCommandOf(
    "reset",
    "clear a trip by naming its cause, as status tells it; leaves the bench dark",
    ["reset permit-expired", "reset case-over --on north"],
  )
    .argument("<cause>", "identifier of the cause, for instance case-over")
    .action((cause: string, options: DaemonOptions) => {
      if (causeById(cause) === undefined) throw noSuchCause(cause);
      return askAndTell(options, { verb: "reset", cause, asker: "person" });
    });

function noSuchCause(cause: string): Trouble {
  const near = nearest(
    cause,
    CAUSES.map((c) => c.id),
  );
  const meant = near === null ? "." : `; did you mean ${near}?`;
  return new Trouble(
    `There is no cause "${cause}"${meant}`,
    "beamsitter status names the one that stands. Nothing was changed.",
    EXIT.usage,
  );
}
