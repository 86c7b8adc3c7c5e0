import { createWriteStream, renameSync, rmSync } from "node:fs";
import { Readable } from "node:stream";
import { pipeline } from "node:stream/promises";
import type { Channel } from "../model/manifest.ts";
import { exportCsv } from "../record/export.ts";
import { ParquetFile } from "../record/export-parquet.ts";
import {
  columnsOf,
  type ExportColumn,
  type ExportRow,
  type Rate,
  type RowsQuery,
  rowsOf,
} from "../record/export-rows.ts";
import { csvHead, csvRow, influxRow, jsonRow } from "../record/export-text.ts";
import type { RecordReader } from "../record/reader.ts";
import { interruptible, Progress } from "./progress.ts";
import { EXIT, Trouble } from "./say.ts";
import { durationOf } from "./values.ts";

/** The formats of `export`, by the endings of their files. */
const FORMATS = { csv: ".csv", parquet: ".parquet", influx: ".lp", jsonl: ".jsonl" } as const;
type Format = keyof typeof FORMATS;

/** Longest step of a reduced export. */
const STEP_ms_MAX = 24 * 3_600_000;

/** What is to be written, and how. */
export interface Export {
  /** A file's name, or - for standard output. */
  readonly file: string;
  readonly format: Format;
  readonly rate: Rate;
  readonly units: "brackets" | "second-line";
  readonly scope: Pick<RowsQuery, "session" | "from" | "to">;
  /** All that there are where undefined. */
  readonly names: readonly string[] | undefined;
  readonly unitOf: (channel: Channel) => string;
}

/** The format asked for, or the one of the file's ending. */
export function formatOf(asked: string | undefined, file: string): Format {
  const known = Object.keys(FORMATS) as Format[];
  const found =
    asked === undefined
      ? (known.find((format) => file.endsWith(FORMATS[format])) ?? "csv")
      : known.find((format) => format === asked);
  if (found === undefined) {
    throw new Trouble(
      `"${asked}" is no format of export.`,
      `There are ${known.join(", ")}. Nothing was written.`,
      EXIT.usage,
    );
  }
  if (found !== "parquet" || file !== "-") return found;
  throw new Trouble(
    "Parquet needs a file: its index is written last.",
    "Name one, night.parquet. Nothing was written.",
    EXIT.usage,
  );
}

/** `full`, `mean:10s`, `minmax:1min`; every sample where nothing is asked. */
export function rateOf(text: string | undefined): Rate {
  if (text === undefined || text === "full") return { kind: "full" };
  const [kind, step] = text.split(":");
  if ((kind === "mean" || kind === "minmax") && step !== undefined) {
    return { kind, step_ms: durationOf(step, STEP_ms_MAX) };
  }
  throw new Trouble(
    `"${text}" is no rate of export.`,
    "Write full, mean:10s or minmax:10s. Nothing was written.",
    EXIT.usage,
  );
}

/** Writes the export; the file appears under its name only when it is whole. */
export async function writeExport(reader: RecordReader, wanted: Export): Promise<void> {
  const progress = new Progress("Exporting");
  try {
    await interruptible(async (signal) => {
      if (wanted.file === "-") {
        await pipeline(Readable.from(piecesOf(reader, wanted, progress)), process.stdout, {
          end: false,
          signal,
        });
      } else await writeFile(reader, wanted, progress, signal);
    });
  } finally {
    progress.end();
  }
}

async function writeFile(
  reader: RecordReader,
  wanted: Export,
  progress: Progress,
  signal: AbortSignal,
): Promise<void> {
  const part = `${wanted.file}.part`;
  try {
    if (wanted.format === "parquet") await writeParquet(part, reader, wanted, progress, signal);
    else {
      const pieces = Readable.from(piecesOf(reader, wanted, progress));
      await pipeline(pieces, createWriteStream(part), { signal });
    }
    renameSync(part, wanted.file);
  } finally {
    rmSync(part, { force: true });
  }
}

async function writeParquet(
  file: string,
  reader: RecordReader,
  wanted: Export,
  progress: Progress,
  signal: AbortSignal,
): Promise<void> {
  const query = queryOf(reader, wanted);
  const parquet = new ParquetFile(file, columnsOf(query));
  for (const rows of rowsOf(reader, query, (done) => progress.tell(done))) {
    await parquet.add(rows);
    await new Promise((resolve) => setImmediate(resolve));
    signal.throwIfAborted();
  }
  await parquet.close();
}

/** The text of an export, in pieces of one stored block. */
function* piecesOf(reader: RecordReader, wanted: Export, progress: Progress): Generator<string> {
  const { format, rate, units, unitOf, names, scope } = wanted;
  if (format === "csv" && rate.kind === "full") {
    yield* exportCsv(reader, {
      ...{ units, unitOf, ...scope },
      ...(names === undefined ? {} : { channels: names }),
    });
    return;
  }
  const query = queryOf(reader, wanted);
  const columns = columnsOf(query);
  const line = lineOf(format, columns);
  if (format === "csv") yield csvHead(columns, units);
  for (const rows of rowsOf(reader, query, (done) => progress.tell(done))) {
    yield rows.map(line).join("");
  }
}

function lineOf(format: Format, columns: readonly ExportColumn[]): (row: ExportRow) => string {
  if (format === "jsonl") return (row) => jsonRow(columns, row);
  return format === "influx" ? (row) => influxRow(columns, row) : csvRow;
}

function queryOf(reader: RecordReader, { names, unitOf, scope, rate }: Export): RowsQuery {
  const { session } = scope;
  const there = reader.channels(session === undefined ? {} : { session });
  const channels = there
    .filter(({ name }) => names === undefined || names.includes(name))
    .map((channel) => ({ name: channel.name, unit: unitOf(channel) }));
  const order = names ?? channels.map(({ name }) => name);
  channels.sort((a, b) => order.indexOf(a.name) - order.indexOf(b.name));
  return { ...scope, channels, rate };
}
