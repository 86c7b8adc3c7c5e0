import { Command } from "commander";
import type { Snapshot } from "../control/api.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { reach } from "./where.ts";

/** `status`: where the bench stands, in sentences. */
export const statusCommand = (): Command =>
  new Command("status")
    .description("tell in sentences where the bench stands")
    .option("--on <name>", "which bench, where several run")
    .option("--json", "the whole snapshot as one JSON object")
    .addHelpText("after", "\nExample:\n  beamsitter status --on north")
    .action(async (options: { on?: string; json?: boolean }) => {
      const { client } = await reach(options.on);
      const answer = await client.ask({ verb: "status" });
      client.close();
      const snapshot = answer.snapshot;
      if (snapshot === undefined) throw new Trouble(answer.words, "Try again.", EXIT.absent);
      if (options.json === true) printJson(snapshot);
      else for (const line of statusLines(snapshot)) print(line);
    });

/** The lines a person reads. */
export function statusLines(s: Snapshot): string[] {
  const lines = [s.sentence];
  if (s.next !== "") lines.push(s.next);
  for (const w of s.warnings) lines.push(`Warning: ${w.words}`);
  if (s.link.words !== "") lines.push(`Link: ${s.link.words}`);
  if (s.recorder.words !== "") lines.push(`Record: ${s.recorder.words}`);
  return lines;
}
