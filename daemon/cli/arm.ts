import type { Command } from "commander";
import { ask, confirm, tell } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, print, resetWords, Trouble } from "./say.ts";
import { currentOf } from "./values.ts";
import { pickNotice } from "./where.ts";

interface Options extends DaemonOptions {
  readonly confirm?: string;
}

/** `arm CURRENT`: the one command that leads to light, so it reads back before it asks. */
export const armCommand = (): Command =>
  daemonCommandOf(
    "arm",
    "arm the bench: after the emission delay, light at this current",
    ["arm 1.2A", "arm 1.2 A --on north", "arm 900mA --confirm 900mA --json"],
    "Tells what that current means just now, then asks for it a second time.",
  )
    .argument("<current...>", "the current you mean, with its unit")
    .option("--confirm <current>", "the same current again, for scripts")
    .action(arm);

async function arm(words: readonly string[], options: Options): Promise<void> {
  const current_mA = currentOf(words);
  // The bench is chosen once: between reading and typing another one may be started.
  const { bench } = pickNotice(options.on);
  const { snapshot } = await ask(bench, { verb: "status" });
  if (snapshot === undefined) {
    throw new Trouble("The daemon tells no state.", "Try again.", EXIT.absent);
  }
  const meant = await ask(bench, { verb: "mean", current_mA });
  if (!meant.ok) {
    tell(meant, options);
    const { cause } = snapshot;
    if (cause !== null && options.json !== true) print(resetWords(bench, cause.id));
    return;
  }
  if (options.json !== true) {
    print(snapshot.safety);
    print(meant.words);
  }
  const same = (text: string): boolean => currentOf([text]) === current_mA;
  await confirm({ wanted: words.join(" "), given: options.confirm, same: orNot(same) });
  const asker = options.confirm === undefined ? "person" : "script";
  tell(await ask(bench, { verb: "arm", current_mA, asker }), options);
}

/** What is no current at all is not the same current either. */
const orNot =
  (same: (text: string) => boolean) =>
  (text: string): boolean => {
    try {
      return same(text);
    } catch (error) {
      if (error instanceof Trouble) return false;
      throw error;
    }
  };
