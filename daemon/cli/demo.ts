import { existsSync } from "node:fs";
import type { Command } from "commander";
import { recordFile } from "../record/folder.ts";
import { NightSummary } from "./answers.ts";
import { commandOf } from "./command.ts";
import { simulateNight } from "./demo-night.ts";
import { print, printJson, Trouble } from "./say.ts";
import { durationOf, wholeOf } from "./values.ts";

interface Options {
  readonly for: string;
  readonly asFastAsPossible?: boolean;
  readonly seed: string;
  readonly data?: string;
  readonly json?: boolean;
}

/** A month: longer nights only fill the disk. */
const NIGHT_ms_MAX = 31 * 24 * 3_600_000;
const SEED_MAX = 4_294_967_295;

/** `demo`: a night of the built-in bench through the real link, judge and recorder. */
export const demoCommand = (): Command =>
  commandOf(
    "demo",
    "run a simulated night of bench north through the real controller, judge and record",
    [
      "demo --for 8h --as-fast-as-possible --seed 7 --json",
      "demo --for=30min --as-fast-as-possible --data night",
    ],
  )
    .option("--for <time>", "how long the night is", "8h")
    .option("--as-fast-as-possible", "without waiting; otherwise sixty times as fast as life")
    .option("--seed <number>", "the same seed gives the same night", "7")
    .option("--data <folder>", "keep the record there, in a folder without one; else none is kept")
    .option("--json", "one JSON object")
    .action(demo);

async function demo(options: Options): Promise<void> {
  const seed = wholeOf("--seed", options.seed, 0, SEED_MAX);
  const length_ms = durationOf(options.for, NIGHT_ms_MAX);
  const folder = options.data ?? null;
  if (folder !== null && existsSync(recordFile(folder))) {
    throw new Trouble(
      `There is a record in ${folder} already; a simulated night is not mixed with it.`,
      "Name a new folder with --data. Nothing was changed.",
    );
  }
  const paced = options.asFastAsPossible !== true;
  const summary = await simulateNight({ length_ms, seed, folder, paced });
  if (options.json === true) printJson(NightSummary, summary);
  else for (const line of sentences(summary)) print(line);
}

function sentences(s: NightSummary): string[] {
  const lines = [
    `${(s.simulatedSeconds / 3600).toFixed(2)} h simulated in ${s.wallSeconds.toFixed(1)} s: ${s.samples} samples in ${s.sessions} sessions.`,
    `The case reached ${s.highestCaseC.toFixed(1)} °C; the current was held down for ${(s.cappedSeconds / 60).toFixed(0)} min; ${s.warnings === 1 ? "1 warning" : `${s.warnings} warnings`}.`,
  ];
  if (s.trips.length === 0) lines.push("Nothing tripped.");
  for (const t of s.trips)
    lines.push(`Tripped by ${t.firstOut} after ${t.atSeconds.toFixed(1)} s.`);
  return lines;
}
