import { Command } from "commander";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { reach } from "./where.ts";

/** `open`: an address with a one-time code that signs a page in. */
export const openCommand = (): Command =>
  new Command("open")
    .description("print an address that signs a page in, once, within ten minutes")
    .option("--on <name>", "which bench, where several run")
    .option("--json", "the address as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter open")
    .action(async (options: { on?: string; json?: boolean }) => {
      const { client } = await reach(options.on);
      const answer = await client.ask({ verb: "sign" });
      client.close();
      if (answer.address === undefined) {
        throw new Trouble(answer.words, "Look at beamsitter status, then try again.", EXIT.absent);
      }
      if (options.json === true) printJson({ address: answer.address });
      else print(answer.address);
    });
