import type { Command } from "commander";
import { Adopted } from "./answers.ts";
import { ask, confirm } from "./ask.ts";
import { readBenchText } from "./bench-text.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, print, printJson } from "./say.ts";

interface Options extends DaemonOptions {
  readonly confirm?: string;
}

/** `adopt FILE`: a changed bench file, first as a difference in words, then in use, only while dark. */
export const adoptCommand = (): Command =>
  daemonCommandOf(
    "adopt",
    "take a changed bench file into use, only while dark",
    ["adopt bench.yaml", "adopt bench.yaml --on north --confirm adopt --json"],
    "Tells in words what would change and asks before it changes anything.",
  )
    .argument("<file>", "the changed bench file")
    .option("--confirm <word>", "the word adopt, for scripts")
    .action(adopt);

async function adopt(file: string, options: Options): Promise<void> {
  const benchText = readBenchText(file);
  const shown = await ask(options.on, { verb: "adopt", benchText, confirm: false });
  const lines = shown.lines ?? [];
  const changes = shown.ok && lines.length > 0;
  if (options.json !== true) {
    print(shown.words);
    for (const line of lines) print(`  ${line}`);
  }
  if (changes) {
    const same = (text: string): boolean => text.trim().toLowerCase() === "adopt";
    await confirm({ wanted: "adopt", given: options.confirm, same });
  }
  const answer = changes
    ? await ask(options.on, { verb: "adopt", benchText, confirm: true })
    : shown;
  if (options.json === true) printJson(Adopted, { ...answer, adopted: changes && answer.ok });
  else if (changes) {
    print(answer.words);
    if (answer.ok) print(`From now on start its daemon with --bench ${file}.`);
  }
  process.exitCode = answer.ok ? EXIT.done : EXIT.refused;
}
