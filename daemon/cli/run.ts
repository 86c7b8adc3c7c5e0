import { Command } from "commander";
import { NORTH } from "./bench-text.ts";
import { durationOf } from "./currents.ts";
import { runBench } from "./run-bench.ts";

interface Options {
  readonly bench?: string;
  readonly data?: string;
  readonly listen?: string;
  readonly port: string;
  readonly for?: string;
  readonly stayDark?: boolean;
}

/** `run`: the daemon, in the foreground. Without a file it runs the built-in bench. */
export const runCommand = (): Command =>
  new Command("run")
    .description("supervise a bench, in the foreground; without --bench, the built-in bench north")
    .option("--bench <file>", "the bench file")
    .option("--data <folder>", "where the record is kept")
    .option("--port <number>", "port of the page; 0 takes a free one", "7808")
    .option("--listen <address>", "address of the page for other machines, for instance 0.0.0.0")
    .option("--for <time>", "end by itself after this long")
    .option("--stay-dark", "the built-in bench's scripted person does not arm it")
    .addHelpText(
      "after",
      `
The built-in bench is armed by a scripted person; every other bench starts dark and stays so until
somebody arms it. Ctrl-C leaves the bench dark.

Examples:
  beamsitter run
  beamsitter run --bench bench.yaml --data /var/lib/beamsitter/bench`,
    )
    .action((options: Options) =>
      runBench({
        file: options.bench ?? NORTH,
        folder: options.data ?? null,
        port: options.port,
        listen: options.listen ?? null,
        for_ms: options.for === undefined ? null : durationOf(options.for),
        stayDark: options.stayDark === true,
      }),
    );
