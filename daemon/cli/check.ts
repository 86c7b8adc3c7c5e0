import { Command } from "commander";
import { consequences } from "../bench-file/describe.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { NORTH, readBenchText } from "./bench-text.ts";
import { EXIT, print, printJson } from "./say.ts";

/** `check FILE`: every error and every doubt of a bench file, at once. Changes nothing. */
export const checkCommand = (): Command =>
  new Command("check")
    .description("read a bench file and tell everything wrong or unwise in it")
    .argument("[file]", "bench file; without one, the built-in bench's")
    .option("--json", "one JSON object {ok, problems}")
    .addHelpText("after", "\nExample:\n  beamsitter check bench.yaml")
    .action((file: string | undefined, options: { json?: boolean }) => {
      const path = file ?? NORTH;
      const parsed = parseBench(readBenchText(path));
      if (options.json === true) printJson({ ok: parsed.ok, problems: parsed.problems });
      else {
        for (const line of problemLines(parsed.problems, file ?? "north.yaml")) print(line);
        if (parsed.ok) for (const line of consequences(parsed.bench)) print(line);
        print(verdict(parsed.ok, parsed.problems.length));
      }
      process.exitCode = parsed.ok ? EXIT.done : EXIT.refused;
    });

function verdict(ok: boolean, count: number): string {
  if (!ok) return "This bench file cannot be used as it is.";
  return count === 0 ? "Nothing to mend." : "It can be used; read the hints above first.";
}
