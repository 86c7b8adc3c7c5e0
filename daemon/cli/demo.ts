import { Command } from "commander";
import { durationOf } from "./currents.ts";
import { simulateNight } from "./demo-night.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";

interface Options {
  readonly for: string;
  readonly asFastAsPossible?: boolean;
  readonly seed: string;
  readonly data?: string;
  readonly json?: boolean;
}

/** `demo`: a night of the built-in bench through the real link, judge and recorder. */
export const demoCommand = (): Command =>
  new Command("demo")
    .description(
      "run a simulated night of bench north through the real controller, judge and record",
    )
    .option("--for <time>", "how long the night is", "8h")
    .option("--as-fast-as-possible", "without waiting; otherwise sixty times as fast as life")
    .option("--seed <number>", "the same seed gives the same night", "7")
    .option("--data <folder>", "keep the record there; otherwise it is thrown away")
    .option("--json", "one JSON object")
    .addHelpText(
      "after",
      "\nExample:\n  beamsitter demo --for 8h --as-fast-as-possible --seed 7 --json",
    )
    .action(async (options: Options) => {
      const seed = Number(options.seed);
      if (!Number.isInteger(seed)) {
        throw new Trouble(
          `--seed ${options.seed} is no whole number.`,
          "Write --seed 7.",
          EXIT.usage,
        );
      }
      const summary = await simulateNight({
        length_ms: durationOf(options.for),
        seed,
        folder: options.data ?? null,
        paced: options.asFastAsPossible !== true,
      });
      if (options.json === true) printJson(summary);
      else for (const line of sentences(summary)) print(line);
    });

function sentences(s: Awaited<ReturnType<typeof simulateNight>>): string[] {
  const lines = [
    `${(s.simulatedSeconds / 3600).toFixed(2)} h simulated in ${s.wallSeconds.toFixed(1)} s: ${s.samples} samples in ${s.sessions} sessions.`,
    `The case reached ${s.highestCaseC.toFixed(1)} °C; the current was held down for ${(s.cappedSeconds / 60).toFixed(0)} min; ${s.warnings} warnings.`,
  ];
  if (s.trips.length === 0) lines.push("Nothing tripped.");
  for (const t of s.trips)
    lines.push(`Tripped by ${t.firstOut} after ${t.atSeconds.toFixed(1)} s.`);
  return lines;
}
