import type { Command } from "commander";
import type { Snapshot } from "../control/api.ts";
import { Status } from "./answers.ts";
import { ask } from "./ask.ts";
import { type DaemonOptions, daemonCommandOf } from "./command.ts";
import { EXIT, print, printJson, resetWords, Trouble } from "./say.ts";

/** `status`: where the bench stands, in sentences. */
export const statusCommand = (): Command =>
  daemonCommandOf("status", "tell in sentences where the bench stands", [
    "status",
    "status --on north --json",
  ]).action(async (options: DaemonOptions) => {
    const { snapshot, words } = await ask(options.on, { verb: "status" });
    if (snapshot === undefined) throw new Trouble(words, "Try again.", EXIT.absent);
    if (options.json === true) printJson(Status, snapshot);
    else for (const line of statusLines(snapshot)) print(line);
  });

/** The lines a person reads. */
function statusLines(s: Snapshot): string[] {
  const lines = [s.sentence];
  if (s.next !== "") lines.push(s.next);
  if (s.enforcement !== "permit") lines.push(s.enforced);
  if (s.cause !== null) lines.push(resetWords(s.bench, s.cause.id));
  for (const w of s.warnings) lines.push(`Warning: ${w.words}`);
  if (s.link.words !== "") lines.push(`Link: ${s.link.words}`);
  if (s.recorder.words !== "") lines.push(`Record: ${s.recorder.words}`);
  return lines;
}
