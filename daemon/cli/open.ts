import type { Command } from "commander";
import { Opened } from "./answers.ts";
import { ask } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";

/** `open`: an address with a one-time code that signs a page in. */
export const openCommand = (): Command =>
  daemonCommandOf("open", "print an address that signs a page in, once, within ten minutes", [
    "open",
    "open --on north --json",
  ]).action(async (options: DaemonOptions) => {
    const { address, words } = await ask(options.on, { verb: "sign" });
    if (address === undefined) {
      throw new Trouble(words, "Look at beamsitter status, then try again.", EXIT.absent);
    }
    if (options.json === true) printJson(Opened, { address });
    else print(address);
  });
