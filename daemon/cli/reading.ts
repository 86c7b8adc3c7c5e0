import { userInfo } from "node:os";
import type { Command } from "commander";
import { parseQuantity } from "../model/quantities.ts";
import { KINDS, QUANTITY_KINDS, type QuantityKind } from "../model/quantity-units.ts";
import { TYPED } from "../model/reading.ts";
import { Readings } from "./answers.ts";
import { benchMeant } from "./bench-meant.ts";
import { comparison } from "./compare.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { SessionKept } from "./sessions-answers.ts";
import { keepIn } from "./sessions-keep.ts";
import { reading } from "./sessions-lines.ts";
import { momentOf, type RecordOptions, recordCommandOf } from "./sessions-where.ts";
import { recordFolder } from "./where.ts";

interface Options extends RecordOptions {
  readonly note?: string;
  readonly who?: string;
  readonly at?: string;
  readonly list?: boolean;
}

/** `reading 1.83 W`: what an instrument beside the bench shows, typed in by a person. */
export const readingCommand = (): Command =>
  recordCommandOf(
    "reading",
    "keep what an instrument beside the bench shows, and compare",
    [
      "reading 1.83 W --note after.warm-up",
      "reading 412mW --at 2026-12-01T22:10",
      "reading --list",
    ],
    "It is recorded beside the samples and never feeds a permit.",
  )
    .argument("[value...]", "the reading with its unit")
    .option("--note <text>", "what stood in the beam, which instrument")
    .option("--who <name>", "who read it; your user name where left out")
    .option("--at <time>", "when, where it is not now: 2026-12-01T22:10")
    .option("--list", "list the readings instead, also those of witnesses")
    .action((words: string[], options: Options) =>
      options.list === true ? list(options) : read(words, options),
    );

async function read(words: string[], options: Options): Promise<void> {
  const { value, unit, kind } = readingOf(words.join(" "));
  const folder = options.data ?? recordFolder(options.on);
  const bench = benchMeant(folder, options.on);
  const at = options.at === undefined ? Date.now() : momentOf(options.at);
  const { id, words: kept } = await keepIn(folder, "Writing", {
    verb: "reading",
    bench,
    name: TYPED,
    wall_ms: at,
    value,
    unit,
    typed: true,
    note: options.note ?? "",
    who: options.who ?? userInfo().username,
  });
  const beside = kind === "power" ? await comparison(folder, bench, at, value) : "";
  const said = [kept, beside].filter((part) => part !== "").join(" ");
  if (options.json === true) printJson(SessionKept, { id, words: said });
  else print(said);
}

/** The reading in the unit that the program holds for its kind, so that readings can be compared. */
function readingOf(text: string): { value: number; unit: string; kind: QuantityKind } {
  for (const kind of QUANTITY_KINDS) {
    const parsed = parseQuantity(kind, text);
    if (parsed.ok) return { value: parsed.value, unit: KINDS[kind].held, kind };
  }
  throw new Trouble(
    text === "" ? "There is no reading." : `Found "${text}"; wanted a number with its unit.`,
    "Write it like 1.83 W. Nothing was changed.",
    EXIT.usage,
  );
}

const list = (options: Options): Promise<void> =>
  reading(options, async ({ reader }) => {
    const readings = reader.readings(options.on);
    if (options.json === true) printJson(Readings, readings);
    else if (readings.length === 0) print("No reading of a witness is kept so far.");
    for (const { at, name, value, unit, note } of options.json === true ? [] : readings) {
      const end = note === "" ? "" : `  ${note}`;
      print(`${new Date(at).toISOString()}  ${name}  ${value} ${unit}${end}`);
    }
  });
