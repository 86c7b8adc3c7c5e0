import { createInterface } from "node:readline/promises";
import type { Question } from "../control/client.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { reach } from "./where.ts";

/** Asks the switch one thing and prints the answer; a refusal ends with exit code 1. */
export async function askAndTell(
  on: string | undefined,
  question: Question,
  json: boolean | undefined,
): Promise<void> {
  const { client } = await reach(on);
  const answer = await client.ask(question);
  client.close();
  if (json === true) printJson(answer);
  else print(answer.words);
  process.exitCode = answer.ok ? EXIT.done : EXIT.refused;
}

/**
 * Has a person type the meant thing a second time. Without a terminal there is nobody to ask, so a
 * script must say it with `--confirm`, in the same words.
 */
export async function confirm(
  sentence: string,
  wanted: string,
  given: string | undefined,
): Promise<void> {
  if (given !== undefined) {
    if (given.replaceAll(" ", "") === wanted.replaceAll(" ", "")) return;
    throw new Trouble(
      `--confirm says ${given}, the command ${wanted}.`,
      "Nothing was changed. Say the same twice.",
      EXIT.usage,
    );
  }
  if (!process.stdin.isTTY) {
    throw new Trouble(
      "Nobody is here to confirm.",
      `From a script say it twice: --confirm ${wanted.replaceAll(" ", "")}. Nothing was changed.`,
      EXIT.usage,
    );
  }
  print(sentence);
  const reader = createInterface({ input: process.stdin, output: process.stdout });
  const typed = await reader.question(`Type ${wanted} to go on, anything else to leave it: `);
  reader.close();
  if (typed.replaceAll(" ", "") !== wanted.replaceAll(" ", "")) {
    throw new Trouble("Left as it was.", "Nothing was changed.", EXIT.refused);
  }
}
