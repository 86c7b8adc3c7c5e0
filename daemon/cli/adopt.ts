import { Command } from "commander";
import { confirm } from "./ask.ts";
import { readBenchText } from "./bench-text.ts";
import { EXIT, print, printJson } from "./say.ts";
import { reach } from "./where.ts";

/** `adopt FILE`: a changed bench file, first as a difference in words, then in use, only while dark. */
export const adoptCommand = (): Command =>
  new Command("adopt")
    .description("take a changed bench file into use, only while dark")
    .argument("<file>", "the changed bench file")
    .option("--on <name>", "which bench, where several run")
    .option("--confirm <word>", "the word adopt, for scripts")
    .option("--json", "the answer as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter adopt bench.yaml")
    .action(async (file: string, options: { on?: string; confirm?: string; json?: boolean }) => {
      const benchText = readBenchText(file);
      const { client } = await reach(options.on);
      const shown = await client.ask({ verb: "adopt", benchText, confirm: false });
      if (options.json !== true) {
        print(shown.words);
        for (const line of shown.lines ?? []) print(`  ${line}`);
      }
      let answer = shown;
      if (shown.ok && (shown.lines ?? []).length > 0) {
        await confirm("The bench would use this file from now on.", "adopt", options.confirm);
        answer = await client.ask({ verb: "adopt", benchText, confirm: true });
        if (options.json !== true) print(answer.words);
      }
      client.close();
      if (options.json === true) printJson(answer);
      process.exitCode = answer.ok ? EXIT.done : EXIT.refused;
    });
