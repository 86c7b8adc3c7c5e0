import { writeFileSync } from "node:fs";
import { dirname, join, relative, resolve } from "node:path";
import type { Command } from "commander";
import { contradictions } from "../bench-file/init/answers.ts";
import { writeBench } from "../bench-file/init/write.ts";
import { parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import { parseQuantity } from "../model/quantities.ts";
import { packageRoot } from "../paths.ts";
import { Initiated } from "./answers.ts";
import { commandOf } from "./command.ts";
import { type Answers, collect, toInit } from "./init-answers.ts";
import { QUESTIONS } from "./init-questions.ts";
import { readGuess } from "./read-guess.ts";
import { readManifest, toldBy } from "./read-manifest.ts";
import { codeOf, EXIT, print, printJson, reasonOf, Trouble } from "./say.ts";

interface Options {
  readonly port?: string;
  readonly guess?: string;
  readonly force?: boolean;
  readonly json?: boolean;
  readonly [key: string]: string | boolean | undefined;
}

/** `init FILE`: asks a few questions and writes a commented bench file that passes `check`. */
export function initCommand(): Command {
  const command = commandOf(
    "init",
    "ask a few questions and write a commented bench file that passes check",
    [
      "init bench.yaml",
      "init bench.yaml --port /dev/ttyUSB0",
      "init bench.yaml --guess heard.json",
      "init bench.yaml --wavelength 808nm --threshold 0.4A --slope 1.05W/A --current 1.8A --absolute 2.2A",
    ],
    "Each question is an option too. At a terminal the rest is asked; elsewhere it is taken as usual.",
  )
    .argument("[file]", "where to write it", "bench.yaml")
    .option("--port <port>", "read the introduction of the board on this port first")
    .option("--guess <file>", "begin from what `listen PORT --guess --json` printed")
    .option("--force", "write over a file that is there")
    .option("--json", "one JSON object {file, bench, hints, next}");
  for (const { key, ask, usual } of QUESTIONS) {
    const end = usual === null ? "" : usual === "" ? " (may be left out)" : ` (usual: ${usual})`;
    command.option(`--${key} <${key === "has" ? "words" : "value"}>`, `${ask}${end}`);
  }
  return command.action((file: string, options: Options) => init(file, options));
}

async function init(file: string, options: Options): Promise<void> {
  const given = givenOf(options);
  const told: Record<string, string> = {};
  if (options.port !== undefined) {
    const baud = given.baud ?? "115200 baud";
    const rate = parseQuantity("baud", baud);
    if (!rate.ok) throw new Trouble(`--baud: found ${rate.found}.`, rate.do, EXIT.usage);
    const manifest = await readManifest(options.port, rate.value);
    Object.assign(told, toldBy(manifest), { path: options.port, baud });
  }
  const guess = options.guess === undefined ? null : readGuess(options.guess);
  Object.assign(told, guess?.told);
  const answers = toInit(await collect(given, told), guess?.stream ?? null);
  const wrong = contradictions(answers);
  if (wrong.length > 0) {
    throw new Trouble(
      wrong.join(" "),
      "Look at the data sheet again. Nothing was written.",
      EXIT.refused,
    );
  }
  const text = writeBench(answers, schemaFrom(file));
  const parsed = parseBench(text);
  if (!parsed.ok) {
    const why = problemLines(parsed.problems, "what would be written").join("\n");
    throw new Trouble(why, "Change these answers. Nothing was written.", EXIT.refused);
  }
  save(file, text, options.force === true);
  const next = [`beamsitter check ${file}`, `beamsitter run --bench ${file}`];
  const hints = parsed.problems.length;
  if (options.json === true) printJson(Initiated, { file, bench: answers.name, hints, next });
  else {
    print(`${file} is written: bench ${answers.name}. It passes check, with ${hints} hints.`);
    print(`Read it through, put in what your data sheet says, then: ${next[0]}`);
    print(`Without a board nothing can light; with one: ${next[1]}`);
  }
}

function givenOf(options: Options): Answers {
  const camel = (key: string): string => key.replace(/-(.)/g, (_all, c: string) => c.toUpperCase());
  const pairs = QUESTIONS.map(({ key }) => [key, options[camel(key)]] as const);
  return Object.fromEntries(
    pairs.filter((pair): pair is [string, string] => typeof pair[1] === "string"),
  );
}

/** Where an editor finds the schema, as seen from the file. */
function schemaFrom(file: string): string {
  const schema = join(packageRoot, "daemon/bench-file/bench.schema.json");
  return relative(dirname(resolve(file)), schema).replaceAll("\\", "/");
}

function save(file: string, text: string, force: boolean): void {
  try {
    // The flag and not a look before: nobody can write between the two.
    writeFileSync(file, text, { flag: force ? "w" : "wx" });
  } catch (error) {
    if (codeOf(error) === "EEXIST") {
      throw new Trouble(
        `${file} is there already.`,
        "Name another file, or say --force.",
        EXIT.refused,
      );
    }
    throw new Trouble(`${file} cannot be written: ${reasonOf(error)}.`, "Name another file.");
  }
}
