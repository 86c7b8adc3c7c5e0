import { Command } from "commander";
import { formatQuantity } from "../model/quantities.ts";
import { askAndTell, confirm } from "./ask.ts";
import { currentOf } from "./currents.ts";
import { EXIT, print, Trouble } from "./say.ts";
import { reach } from "./where.ts";

/** `arm CURRENT`: the one command that leads to light, so it reads back before it asks. */
export const armCommand = (): Command =>
  new Command("arm")
    .description("arm the bench: after the emission delay, light at this current")
    .argument("<current>", "the current you mean, with its unit: 1.2A")
    .option("--on <name>", "which bench, where several run")
    .option("--confirm <current>", "the same current again, for scripts")
    .option("--json", "the answer as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter arm 1.2A")
    .action(async (text: string, options: { on?: string; confirm?: string; json?: boolean }) => {
      const current_mA = currentOf(text);
      const { client, notice } = await reach(options.on);
      const { snapshot } = await client.ask({ verb: "status" });
      client.close();
      if (snapshot === undefined)
        throw new Trouble("The daemon tells no state.", "Try again.", EXIT.absent);
      if (options.json !== true) print(snapshot.safety);
      const shown = formatQuantity("current", current_mA);
      const sentence = `${notice.bench} will be armed at ${shown}; light starts after the emission delay.`;
      await confirm(sentence, text, options.confirm);
      const asker = options.confirm === undefined ? "person" : "script";
      await askAndTell(notice.bench, { verb: "arm", current_mA, asker }, options.json);
    });
