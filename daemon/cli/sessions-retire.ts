import type { Command } from "commander";
import { EXIT, Trouble } from "./say.ts";
import { keepAndTell } from "./sessions-keep.ts";
import { type RecordOptions, recordCommandOf } from "./sessions-where.ts";
import { wholeOf } from "./values.ts";

interface RetireOptions extends RecordOptions {
  readonly keepDays?: string;
  readonly keepGb?: string;
  readonly exportedTo?: string;
}

/** `sessions retire`: takes the full rate of old samples away; everything else stays for ever. */
export const retireCommand = (): Command =>
  recordCommandOf("retire", "take the full rate of old samples away; their statistics stay", [
    "sessions retire --keep-days 400",
    "sessions retire --keep-gb 20 --exported-to influx --json",
  ])
    .option("--keep-days <number>", "samples younger than so many days keep their full rate")
    .option("--keep-gb <number>", "the oldest go until the rest takes so many gigabytes")
    .option("--exported-to <target>", "only what was exported there goes, such as influx")
    .action((options: RetireOptions) => {
      const { keepDays, keepGb, exportedTo } = options;
      if (keepDays === undefined && keepGb === undefined) {
        throw new Trouble(
          "Neither --keep-days nor --keep-gb is there, so nothing says how much to keep.",
          "Name one or both. Nothing was changed.",
          EXIT.usage,
        );
      }
      return keepAndTell("Taking away", options, {
        verb: "retire",
        days: keepDays === undefined ? null : wholeOf("--keep-days", keepDays, 1, 36_500),
        gigabytes: keepGb === undefined ? null : wholeOf("--keep-gb", keepGb, 1, 1_000_000),
        exportedTo: exportedTo ?? null,
      });
    });
