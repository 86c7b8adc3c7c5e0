import { userInfo } from "node:os";
import type { Command } from "commander";
import { EPOCH_PARTS, type EpochPart, epochWords } from "../model/epoch.ts";
import { parseQuantity } from "../model/quantities.ts";
import { QUANTITY_KINDS } from "../model/quantity-units.ts";
import { Epochs } from "./answers.ts";
import { benchMeant } from "./bench-meant.ts";
import { EXIT, print, printJson, Trouble } from "./say.ts";
import { keepAndTell } from "./sessions-keep.ts";
import { reading } from "./sessions-lines.ts";
import { momentOf, type RecordOptions, recordCommandOf } from "./sessions-where.ts";
import { recordFolder } from "./where.ts";

interface Options extends RecordOptions {
  readonly serial?: string;
  readonly note?: string;
  readonly who?: string;
  readonly at?: string;
  readonly list?: boolean;
}

/** `change PART`: another diode, crystal, detector …; a new epoch of that part begins. */
export const changeCommand = (): Command =>
  recordCommandOf(
    "change",
    "tell that a part was changed by hand: a new epoch begins",
    [
      "change diode threshold=0.42A slope=1.02W/A --serial D-17 --note new.diode",
      "change mount --note screws.tightened --at 2026-12-01T22:10",
      "change --list",
    ],
    "Values are those of the part's data sheet, each with its unit. Nothing is judged by them; the\n" +
      "bench file says what is judged (see adopt).",
  )
    .argument("[part]", EPOCH_PARTS.join(", "))
    .argument("[values...]", "data-sheet values, name=value")
    .option("--serial <text>", "serial number of the new part")
    .option("--note <text>", "what was done, and why")
    .option("--who <name>", "who did it; your user name where left out")
    .option("--at <time>", "when, where it is not now: 2026-12-01T22:10")
    .option("--list", "list the changes instead")
    .action((part: string | undefined, values: string[], options: Options) =>
      options.list === true ? list(options) : change(part, values, options),
    );

async function change(part: string | undefined, values: string[], options: Options): Promise<void> {
  const folder = options.data ?? recordFolder(options.on);
  await keepAndTell("Writing", options, {
    verb: "epoch",
    bench: benchMeant(folder, options.on),
    part: partOf(part),
    wall_ms: options.at === undefined ? null : momentOf(options.at),
    serial: options.serial ?? "",
    note: options.note ?? "",
    who: options.who ?? userInfo().username,
    values: Object.fromEntries(values.map(sheetValue)),
  });
}

function partOf(text: string | undefined): EpochPart {
  const part = EPOCH_PARTS.find((known) => known === text);
  if (part !== undefined) return part;
  throw new Trouble(
    text === undefined ? "What was changed is not said." : `"${text}" is no part of a bench here.`,
    `Say one of ${EPOCH_PARTS.join(", ")}. Nothing was changed.`,
    EXIT.usage,
  );
}

/** A value must be a quantity of some kind, so that it can be compared in a year. */
function sheetValue(text: string): [string, string] {
  const match = /^([a-z][a-z0-9-]{0,30})=(.{1,60})$/.exec(text);
  const [, name, value] = match ?? [];
  const isQuantity = QUANTITY_KINDS.some((kind) => parseQuantity(kind, value ?? "").ok);
  if (name !== undefined && value !== undefined && isQuantity) return [name, value];
  throw new Trouble(
    `Found "${text}"; wanted a value with its unit, such as threshold=0.42A.`,
    "Write what cannot be written so into --note. Nothing was changed.",
    EXIT.usage,
  );
}

const list = (options: Options): Promise<void> =>
  reading(options, async ({ reader }) => {
    const epochs = reader.epochs(options.on);
    if (options.json === true) printJson(Epochs, epochs);
    else if (epochs.length === 0) print("Nothing has been changed by hand so far.");
    for (const epoch of options.json === true ? [] : epochs) {
      print(`${new Date(epoch.at).toISOString()}  ${epochWords(epoch)}`);
    }
  });
