import type { Command } from "commander";
import { Sessions } from "./answers.ts";
import { commandOf } from "./command.ts";
import { formatOf, rateOf, writeExport } from "./export-ways.ts";
import { fetchMeant, isFromInflux } from "./from-influx.ts";
import { namesOf, openOrSay, unitOf } from "./record-units.ts";
import { codeOf, printJson, reasonOf, Trouble } from "./say.ts";
import { momentOf, sessionNumber } from "./sessions-where.ts";
import { recordFolder } from "./where.ts";

interface Options {
  readonly on?: string;
  readonly data?: string;
  readonly session?: string;
  readonly from?: string;
  readonly to?: string;
  readonly bench?: string;
  readonly channels?: string;
  readonly format?: string;
  readonly rate?: string;
  readonly unitsLine?: boolean;
  readonly json?: boolean;
}

/** `export FILE`: the record in a format that others read; or the list of sessions as JSON. */
export const exportCommand = (): Command =>
  commandOf(
    "export",
    "write the record as CSV, Parquet, InfluxDB lines or JSON lines, also while the daemon runs",
    [
      "export night.csv --session 4",
      "export night.parquet --session 4 --rate mean:10s",
      "export --on north --json",
      "export - --channels current,case --from 2026-12-01T22:00Z --to 2026-12-02T06:00Z",
      "export night.csv --from influx --bench bench.yaml --session 4",
    ],
  )
    .argument("[file]", "where to write; - or nothing is standard output")
    .option("--on <name>", "which bench's record, where there are several")
    .option("--data <folder>", "the data folder or a pack, where it is not the usual one")
    .option("--session <number>", "only this session; --json lists their numbers")
    .option(
      "--from <time>",
      "from this moment, 2026-12-01T22:00Z; influx reads the server instead, influx:TIME both",
    )
    .option("--bench <file>", "with --from influx: the bench file that names the server")
    .option("--to <time>", "up to this moment")
    .option("--channels <names>", "names with commas between, current,case,judge.ceiling")
    .option(
      "--format <name>",
      "csv, parquet, influx or jsonl; else as the file's ending says, else csv",
    )
    .option("--rate <what>", "full, mean:10s or minmax:10s; every sample where left out")
    .option("--units-line", "units on a second header line instead of in brackets")
    .option("--json", "the sessions as one JSON array, instead of samples")
    .action((file: string | undefined, options: Options) => exportFrom(file ?? "-", options));

async function exportFrom(file: string, options: Options): Promise<void> {
  if (!isFromInflux(options.from)) {
    await exportRecord(file, options.data ?? recordFolder(options.on), options);
    return;
  }
  const fetched = await fetchMeant(options);
  // What was fetched is what was meant; its sessions have other numbers here.
  const { session: _, from: __, ...rest } = options;
  try {
    await exportRecord(file, fetched.folder, rest);
  } finally {
    fetched.remove();
  }
}

async function exportRecord(file: string, folder: string, options: Options): Promise<void> {
  const { reader, conversions } = openOrSay(folder);
  try {
    if (options.json === true) {
      printJson(Sessions, reader.sessions());
      return;
    }
    const scope = {
      ...(options.session === undefined
        ? {}
        : { session: sessionNumber(options.session, reader).id }),
      ...(options.from === undefined ? {} : { from: momentOf(options.from) }),
      ...(options.to === undefined ? {} : { to: momentOf(options.to) }),
    };
    const names = options.channels === undefined ? undefined : namesOf(options.channels, reader);
    await writeExport(reader, {
      file,
      format: formatOf(options.format, file),
      rate: rateOf(options.rate),
      units: options.unitsLine === true ? "second-line" : "brackets",
      scope,
      names,
      unitOf: ({ name, unit }) => unitOf(name, unit, conversions),
    });
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
