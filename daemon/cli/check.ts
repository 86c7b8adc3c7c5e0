import type { Command } from "commander";
import { consequences } from "../bench-file/describe.ts";
import { explain } from "../bench-file/explain.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { Checked, Explained } from "./answers.ts";
import { NORTH, readBenchText } from "./bench-text.ts";
import { commandOf } from "./command.ts";
import { worstPermitAge_ms } from "./measured.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { durationOf } from "./values.ts";

interface Options {
  readonly explain?: string;
  readonly age?: string;
  readonly json?: boolean;
}

/** A permit older than this has outlived every term. */
const AGE_ms_MAX = 10_000;

/** `check FILE`: every error and every doubt of a bench file, at once. Changes nothing. */
export const checkCommand = (): Command =>
  commandOf("check", "read a bench file and tell everything wrong or unwise in it", [
    "check bench.yaml",
    "check bench.yaml --json",
    "check --explain case-over",
    "check bench.yaml --explain hunts",
  ])
    .argument("[file]", "bench file; without one, the built-in bench's")
    .option("--explain <row>", "what a code of check or a row of the hazard table means")
    .option("--age <time>", "worst age of a permit; without it, as recorded in the last week")
    .option("--json", "one JSON object {ok, problems}")
    .action((file: string | undefined, options: Options) =>
      options.explain === undefined
        ? check(file, options)
        : explainRow(options.explain, file, options),
    );

async function check(file: string | undefined, options: Options): Promise<void> {
  const text = readBenchText(file ?? NORTH);
  const first = parseBench(text);
  const age = options.age === undefined ? null : durationOf(options.age, AGE_ms_MAX);
  const permitAge_ms = age ?? (first.ok ? await worstPermitAge_ms(first.bench.name) : null);
  const parsed = permitAge_ms === null ? first : parseBench(text, { permitAge_ms });
  if (options.json === true) {
    printJson(Checked, { ok: parsed.ok, problems: [...parsed.problems] });
  } else {
    for (const line of problemLines(parsed.problems, file ?? "north.yaml")) print(line);
    if (parsed.ok) for (const line of consequences(parsed.bench)) print(line);
    print(verdict(parsed.ok, parsed.problems.length));
  }
  process.exitCode = parsed.ok ? EXIT.done : EXIT.refused;
}

function explainRow(row: string, file: string | undefined, options: Options): void {
  const parsed = file === undefined ? null : parseBench(readBenchText(file));
  const answer = explain(row, parsed?.ok === true ? parsed.bench : null);
  if (answer.lines === null) {
    throw new Trouble(
      `There is no code and no row "${row}".`,
      answer.near === null
        ? "Codes stand behind each problem of check --json; rows are the keys of hazards."
        : `Did you mean ${answer.near}?`,
      EXIT.usage,
    );
  }
  if (options.json === true) printJson(Explained, { row, lines: answer.lines });
  else for (const line of answer.lines) print(line);
}

function verdict(ok: boolean, count: number): string {
  if (!ok) return "This bench file cannot be used as it is.";
  return count === 0 ? "Nothing to mend." : "It can be used; read the hints above first.";
}
