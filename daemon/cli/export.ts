import { createWriteStream } from "node:fs";
import { Readable } from "node:stream";
import { pipeline } from "node:stream/promises";
import type { Command } from "commander";
import { exportCsv } from "../record/export.ts";
import type { RecordReader } from "../record/reader.ts";
import { Sessions } from "./answers.ts";
import { commandOf } from "./command.ts";
import { namesOf, openOrSay, unitOf } from "./record-units.ts";
import { codeOf, EXIT, printJson, reasonOf, Trouble } from "./say.ts";
import { recordFolder } from "./where.ts";

interface Options {
  readonly on?: string;
  readonly data?: string;
  readonly session?: string;
  readonly from?: string;
  readonly to?: string;
  readonly channels?: string;
  readonly unitsLine?: boolean;
  readonly json?: boolean;
}

/** `export FILE`: the record as CSV, at full rate; or the list of sessions as JSON. */
export const exportCommand = (): Command =>
  commandOf("export", "write the record as CSV, at full rate, also while the daemon runs", [
    "export night.csv --session 4",
    "export --on north --json",
    "export - --channels current,case --from 2026-12-01T22:00Z --to 2026-12-02T06:00Z",
  ])
    .argument("[file]", "where to write; - or nothing is standard output")
    .option("--on <name>", "which bench's record, where there are several")
    .option("--data <folder>", "the data folder, where it is not the usual one")
    .option("--session <number>", "only this session; --json lists their numbers")
    .option("--from <time>", "from this moment, 2026-12-01T22:00Z")
    .option("--to <time>", "up to this moment")
    .option("--channels <names>", "names with commas between, current,case,judge.ceiling")
    .option("--units-line", "units on a second header line instead of in brackets")
    .option("--json", "the sessions as one JSON array, instead of samples")
    .action((file: string | undefined, options: Options) => exportRecord(file ?? "-", options));

async function exportRecord(file: string, options: Options): Promise<void> {
  const folder = options.data ?? recordFolder(options.on);
  const { reader, conversions } = openOrSay(folder);
  try {
    if (options.json === true) {
      printJson(Sessions, reader.sessions());
      return;
    }
    const lines = exportCsv(reader, {
      units: options.unitsLine === true ? "second-line" : "brackets",
      unitOf: ({ name, unit }) => unitOf(name, unit, conversions),
      ...(options.session === undefined ? {} : { session: sessionOf(options.session, reader) }),
      ...(options.from === undefined ? {} : { from: momentOf(options.from) }),
      ...(options.to === undefined ? {} : { to: momentOf(options.to) }),
      ...(options.channels === undefined ? {} : { channels: namesOf(options.channels, reader) }),
    });
    const to = file === "-" ? process.stdout : createWriteStream(file);
    await pipeline(Readable.from(lines), to, { end: file !== "-" });
    for (const fault of reader.faults) process.stderr.write(`Left out: ${fault}\n`);
  } catch (error) {
    if (error instanceof Trouble) throw error;
    // Whoever read the samples has seen enough.
    if (file === "-" && codeOf(error) === "EPIPE") return;
    throw new Trouble(`The export stopped: ${reasonOf(error)}.`, "Nothing of the record changed.");
  } finally {
    reader.close();
  }
}

function sessionOf(text: string, reader: RecordReader): number {
  const session = reader.sessions().find((s) => String(s.id) === text);
  if (session !== undefined) return session.id;
  const ids = reader.sessions().map((s) => s.id);
  throw new Trouble(
    `There is no session ${text}.`,
    ids.length === 0 ? "The record is empty." : `There are ${ids.slice(-10).join(", ")}.`,
    EXIT.usage,
  );
}

function momentOf(text: string): number {
  const at = Date.parse(text);
  if (!Number.isNaN(at)) return at;
  throw new Trouble(
    `${text} is no moment.`,
    "Write it like 2026-12-01T22:00Z, or 2026-12-01T22:00 for local time.",
    EXIT.usage,
  );
}
