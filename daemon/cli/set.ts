import type { Command } from "commander";
import { askAndTell } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { currentOf } from "./values.ts";

/** `set CURRENT`: another current, inside the corridor, while armed. */
export const setCommand = (): Command =>
  daemonCommandOf("set", "ask for another current while armed or emitting", [
    "set 1.5A",
    "set 0 A --on north",
  ])
    .argument("<current...>", "the current you mean, with its unit; 0 A goes below threshold")
    .action((words: readonly string[], options: DaemonOptions) =>
      askAndTell(options, { verb: "set", current_mA: currentOf(words), asker: "person" }),
    );
