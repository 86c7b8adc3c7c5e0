import { existsSync, mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import type { Command } from "commander";
import { type Imported, importFile } from "../record/import.ts";
import { makePack } from "../record/pack.ts";
import { openReader } from "../record/reader.ts";
import { carryOut, interruptible, Progress } from "./progress.ts";
import { print, printJson } from "./say.ts";
import { SessionImported } from "./sessions-answers.ts";
import { keepIn } from "./sessions-keep.ts";
import { momentOf, outOfRecord, type RecordOptions, recordCommandOf } from "./sessions-where.ts";
import { length, moment } from "./sessions-words.ts";
import { dataFolder, recordFolder } from "./where.ts";

interface Options extends RecordOptions {
  readonly map?: string;
  readonly zone?: string;
  readonly start?: string;
  readonly check?: boolean;
}

const BAD_TOLD = 20; // Bad rows told one by one at a terminal.

/** `sessions import FILE`: an old logger's night, or a spreadsheet's, as a session. */
export const importCommand = (): Command =>
  recordCommandOf(
    "import",
    "bring a CSV or Parquet file from elsewhere in, as a session of kind watched",
    [
      "sessions import old.csv --map time=Stamp,current=I[A],case=T[degC] --zone Europe/Berlin",
      "sessions import old.csv --map time=#1[s],photodiode=#4[mW] --start 2026-12-01T20:00Z",
      "sessions import night.csv --check",
    ],
    "Columns that are named as channels are, with their unit in brackets, need no --map. Rows that cannot be read are left out and named by line; a missing stretch is kept as a gap.",
  )
    .argument("<file>", "a CSV file (commas, semicolons or tabs), or one that ends in .parquet")
    .option("--map <text>", "what the columns mean: channel=column[unit], with commas between")
    .option("--zone <name>", "zone of stamps that name none: Europe/Berlin, UTC, +01:00")
    .option("--start <time>", "moment from which plain numbers of the time column count")
    .option("--check", "only read the file and tell; nothing is kept")
    .action(importAndTell);

async function importAndTell(file: string, options: Options): Promise<void> {
  const scratch = mkdtempSync(join(tmpdir(), "beamsitter-import-"));
  try {
    const from = join(scratch, "data");
    if (options.check === true) tell(await read(file, options, "imported", from), null, options);
    else {
      const { folder, bench } = goal(options);
      const found = await read(file, options, bench, from);
      tell(found, await bringIn(from, scratch, folder), options);
    }
  } catch (error) {
    throw outOfRecord(error);
  } finally {
    rmSync(scratch, { recursive: true, force: true });
  }
}

/** Where it goes, and as which bench's: that of the record's last session, else the one named. */
function goal({ data, on }: Options): { folder: string; bench: string } {
  // A bench without a record yet may be named: its record begins with this.
  const isNew = data === undefined && on !== undefined && !existsSync(dataFolder(on));
  const folder = data ?? (isNew ? dataFolder(on) : recordFolder(on));
  if (!existsSync(join(folder, "record.sqlite"))) return { folder, bench: on ?? "imported" };
  const reader = openReader(folder);
  try {
    return { folder, bench: reader.sessions().at(-1)?.bench ?? on ?? "imported" };
  } finally {
    reader.close();
  }
}

async function read(
  file: string,
  { map, zone, start }: Options,
  bench: string,
  folder: string,
): Promise<Imported> {
  const times = { zone: zone ?? null, start_ms: start === undefined ? null : momentOf(start) };
  const progress = new Progress("Reading");
  const tellPart = (part: number): void => progress.tell({ done: part, total: 1 });
  try {
    return await interruptible((signal) =>
      importFile({ file, map, times, bench }, folder, tellPart, signal),
    );
  } finally {
    progress.end();
  }
}

/** Through a pack: it comes in whole or not at all, also while a daemon runs. */
async function bringIn(from: string, scratch: string, folder: string): Promise<number> {
  const pack = join(scratch, "imported.bsp");
  const reader = openReader(from);
  try {
    await carryOut("Packing", makePack(reader.parts().db, 1, pack, Date.now()));
  } finally {
    reader.close();
  }
  return (await keepIn(folder, "Importing", { verb: "unpack", file: pack })).id;
}

function tell(found: Imported, session: number | null, { json }: Options): void {
  const { rows, badRows, bad, from_ms: from, to_ms: to, rate_perS: ratePerS } = found;
  const channels = [...found.channels];
  if (json === true) {
    const answer = { session, rows, from, to, ratePerS, channels, badRows, bad: [...bad] };
    printJson(SessionImported, answer);
    return;
  }
  for (const { line, why } of bad.slice(0, BAD_TOLD)) print(`Line ${line}: ${why}.`);
  const more = badRows - Math.min(BAD_TOLD, bad.length);
  if (more > 0) print(`${more} more rows like these.`);
  const what = `${rows} rows of ${channels.map((c) => `${c.name} [${c.unit}]`).join(", ")}`;
  const left = badRows === 0 ? "no row was left out" : `${badRows} rows were left out`;
  print(`${what}, ${length(to - from)} from ${moment(from)}; ${left}.`);
  print(session === null ? "Nothing was kept." : `It is session ${session} here.`);
}
