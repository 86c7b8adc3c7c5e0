import type { Command } from "commander";
import { consequences } from "../bench-file/describe.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { Checked } from "./answers.ts";
import { NORTH, readBenchText } from "./bench-text.ts";
import { commandOf } from "./command.ts";
import { EXIT, print, printJson } from "./say.ts";

/** `check FILE`: every error and every doubt of a bench file, at once. Changes nothing. */
export const checkCommand = (): Command =>
  commandOf("check", "read a bench file and tell everything wrong or unwise in it", [
    "check bench.yaml",
    "check bench.yaml --json",
  ])
    .argument("[file]", "bench file; without one, the built-in bench's")
    .option("--json", "one JSON object {ok, problems, consequences}")
    .action((file: string | undefined, options: { json?: boolean }) => {
      const parsed = parseBench(readBenchText(file ?? NORTH));
      const follows = parsed.ok ? consequences(parsed.bench) : [];
      if (options.json === true) {
        const { ok, problems } = parsed;
        printJson(Checked, { ok, problems: [...problems], consequences: follows });
      } else {
        for (const line of problemLines(parsed.problems, file ?? "north.yaml")) print(line);
        for (const line of follows) print(line);
        print(verdict(parsed.ok, parsed.problems.length));
      }
      process.exitCode = parsed.ok ? EXIT.done : EXIT.refused;
    });

function verdict(ok: boolean, count: number): string {
  if (!ok) return "This bench file cannot be used as it is.";
  return count === 0 ? "Nothing to mend." : "It can be used; read the hints above first.";
}
