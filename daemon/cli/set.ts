import { Command } from "commander";
import { askAndTell } from "./ask.ts";
import { currentOf } from "./currents.ts";

/** `set CURRENT`: another current, inside the corridor, while armed. */
export const setCommand = (): Command =>
  new Command("set")
    .description("ask for another current while armed or emitting")
    .argument("<current>", "the current you mean, with its unit: 1.5A; 0A goes below threshold")
    .option("--on <name>", "which bench, where several run")
    .option("--json", "the answer as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter set 1.5A")
    .action((text: string, options: { on?: string; json?: boolean }) =>
      askAndTell(
        options.on,
        { verb: "set", current_mA: currentOf(text), asker: "person" },
        options.json,
      ),
    );
