import { Command } from "commander";
import { askAndTell } from "./ask.ts";

/** `reset CAUSE`: takes the latch off, by naming what it was. */
export const resetCommand = (): Command =>
  new Command("reset")
    .description("clear a trip by naming its cause, as status tells it; leaves the bench dark")
    .argument("<cause>", "identifier of the cause, for instance case-over")
    .option("--on <name>", "which bench, where several run")
    .option("--json", "the answer as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter reset permit-expired")
    .action((cause: string, options: { on?: string; json?: boolean }) =>
      askAndTell(options.on, { verb: "reset", cause, asker: "person" }, options.json),
    );
