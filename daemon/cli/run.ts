import type { Command } from "commander";
import { NORTH } from "./bench-text.ts";
import { commandOf } from "./command.ts";
import { runBench } from "./run-bench.ts";
import { durationOf, wholeOf } from "./values.ts";

interface Options {
  readonly bench?: string;
  readonly data?: string;
  readonly listen?: string;
  readonly port: string;
  readonly for?: string;
  readonly stayDark?: boolean;
  readonly json?: boolean;
}

/** The longest that a timer of the system can wait, a little over 24 days. */
const FOR_ms_MAX = 24 * 24 * 3_600_000;

/** `run`: the daemon, in the foreground. Without a file it runs the built-in bench. */
export const runCommand = (): Command =>
  commandOf(
    "run",
    "supervise a bench, in the foreground; without --bench, the built-in bench north",
    [
      "run",
      "run --bench bench.yaml --data /var/lib/beamsitter/bench",
      "run --bench=bench.yaml --port=0 --json",
    ],
    "The built-in bench is armed by a scripted person; every other bench starts dark and stays so until\nsomebody arms it. Ctrl-C leaves the bench dark.",
  )
    .option("--bench <file>", "the bench file")
    .option("--data <folder>", "where the record is kept")
    .option("--port <number>", "port of the page; 0 takes a free one", "7808")
    .option("--listen <address>", "address of the page for other machines, for instance 0.0.0.0")
    .option("--for <time>", "end by itself after this long")
    .option("--stay-dark", "the built-in bench's scripted person does not arm it")
    .option("--json", "one JSON object a line: started, each event, ended")
    .action((options: Options) =>
      runBench({
        file: options.bench ?? NORTH,
        folder: options.data ?? null,
        port: wholeOf("--port", options.port, 0, 65_535),
        listen: options.listen ?? null,
        for_ms: options.for === undefined ? null : durationOf(options.for, FOR_ms_MAX),
        stayDark: options.stayDark === true,
        json: options.json === true,
      }),
    );
