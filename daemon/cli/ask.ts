import { createInterface } from "node:readline";
import type { SwitchAnswer } from "../control/api.ts";
import type { Question } from "../control/client.ts";
import { Told } from "./answers.ts";
import type { DaemonOptions } from "./command.ts";
import { EXIT, print, printJson, reasonOf, Trouble } from "./say.ts";
import { reach } from "./where.ts";

/** Asks the daemon meant one thing. A silence is a trouble, a refusal is an answer. */
export async function ask(on: string | undefined, question: Question): Promise<SwitchAnswer> {
  const { client, notice } = await reach(on);
  try {
    return await client.ask(question);
  } catch (error) {
    throw new Trouble(
      `The daemon of ${notice.bench} (process ${notice.pid}) did not answer: ${reasonOf(error)}`,
      `Without its permits the board is dark by itself. See beamsitter status; to end it: beamsitter dark --on ${notice.bench}.`,
      EXIT.absent,
    );
  } finally {
    client.close();
  }
}

/** Asks the switch one thing and prints the answer; a refusal ends with exit code 1. */
export async function askAndTell(options: DaemonOptions, question: Question): Promise<void> {
  tell(await ask(options.on, question), options);
}

/** Prints an answer of the judge; a refusal ends with exit code 1. */
export function tell(answer: SwitchAnswer, options: DaemonOptions): void {
  if (options.json === true) printJson(Told, answer);
  else print(answer.words);
  process.exitCode = answer.ok ? EXIT.done : EXIT.refused;
}

/** How somebody says a thing a second time. */
export interface Again {
  /** What is asked for, as the person wrote it. */
  readonly wanted: string;
  /** What a script gave with `--confirm`. */
  readonly given: string | undefined;
  /** Whether a text means the same as `wanted`. */
  same(text: string): boolean;
}

/**
 * Has a person type the meant thing a second time. Without a terminal there is nobody to ask, so a
 * script must say it with `--confirm`.
 */
export async function confirm({ wanted, given, same }: Again): Promise<void> {
  const short = wanted.replaceAll(" ", "");
  if (given !== undefined) {
    if (same(given)) return;
    throw new Trouble(
      `--confirm says "${given}", the command "${wanted}".`,
      "Say the same twice. Nothing was changed.",
      EXIT.usage,
    );
  }
  if (!process.stdin.isTTY) {
    throw new Trouble(
      "Nobody is here to confirm.",
      `From a script say it twice: --confirm ${short}. Nothing was changed.`,
      EXIT.usage,
    );
  }
  const typed = await typedLine(`Type ${wanted} again to go on, anything else to leave it: `);
  if (typed !== null && same(typed)) return;
  if (typed === null) process.stderr.write("\n");
  throw new Trouble("Left as it was.", "", EXIT.refused);
}

/** A line typed at the terminal; null where the person ended it instead (Ctrl-C, Ctrl-D). */
function typedLine(question: string): Promise<string | null> {
  return new Promise((resolve) => {
    // Written to stderr, so that the answer alone stands on stdout.
    const reader = createInterface({ input: process.stdin, output: process.stderr });
    reader.on("close", () => {
      resolve(null);
    });
    reader.question(question, (text) => {
      resolve(text);
      reader.close();
    });
  });
}
