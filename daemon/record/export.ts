import { STATES } from "../judge/records.ts";
import { MAKERS } from "../model/ceiling.ts";
import type { Channel } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";
import type { Block } from "./blocks.ts";
import { type Chunk, type ChunkFilter, ChunkIndex } from "./chunks.ts";
import { placeOf } from "./columns.ts";
import type { ReadParts, RecordReader } from "./reader.ts";
import { countsFor } from "./rollup.ts";

/** What goes into a CSV file. Without session and window it is all that the folder has. */
export interface CsvQuery {
  readonly bench?: string;
  readonly session?: number;
  /** Civil time, milliseconds since 1970; `to` is not included. */
  readonly from?: number;
  readonly to?: number;
  /** Names as in the manifest or `judge.*`; all that there are where none are named. */
  readonly channels?: readonly string[];
  /** Unit in which the reader's converter gives a channel; the manifest's own where left out. */
  readonly unitOf?: (channel: Channel) => string;
  /** Units in brackets behind the names, or on a line of their own below them. */
  readonly units: "brackets" | "second-line";
}

const LINE_END = "\r\n";
/** Digits beyond what any converter here can give. */
const DIGITS = 9;

/** Codes that people read better as words. */
const WORDS: Readonly<Record<string, readonly string[]>> = {
  "judge.state": STATES,
  "judge.maker": MAKERS,
};

/**
 * The samples as CSV (RFC 4180), at full rate, a stored block at a time; the first piece is the
 * header. Columns: civil time in UTC, seconds since the first sample (monotonic clock while one
 * daemon ran), controller tick, then the channels in units. A cell is empty where that sample did
 * not bring that channel. Damaged blocks are named in the reader's `faults` and left out.
 */
export function* exportCsv(reader: RecordReader, query: CsvQuery): Generator<string> {
  const parts = reader.parts();
  const filter = filterOf(query);
  const { unitOf = (channel: Channel) => channel.unit } = query;
  const channels = reader.channels(filter);
  const units = new Map(channels.map((channel) => [channel.name, unitOf(channel)]));
  const names = query.channels ?? [...units.keys()];
  yield header(names, units, query.units);
  const index = new ChunkIndex(parts.db, filter);
  const clock = new Elapsed();
  for (const chunk of index.chunks) {
    const block = index.open(chunk);
    if ("fault" in block) parts.faults.add(block.fault);
    else yield blockLines(parts, chunk, block, names, query, clock);
  }
}

function filterOf(query: CsvQuery): ChunkFilter {
  const { bench, session, from, to } = query;
  return {
    ...(bench === undefined ? {} : { bench }),
    ...(session === undefined ? {} : { session }),
    ...(from === undefined ? {} : { from }),
    ...(to === undefined ? {} : { to }),
  };
}

function header(
  names: readonly string[],
  units: ReadonlyMap<string, string>,
  place: CsvQuery["units"],
): string {
  const columns = [
    { name: "time", unit: "UTC" },
    { name: "elapsed", unit: "s" },
    { name: "tick", unit: "tick" },
    ...names.map((name) => ({ name, unit: name in WORDS ? "" : (units.get(name) ?? "") })),
  ];
  if (place === "second-line") {
    return csvLine(columns.map((c) => c.name)) + csvLine(columns.map((c) => c.unit));
  }
  return csvLine(columns.map((c) => (c.unit === "" ? c.name : `${c.name} [${c.unit}]`)));
}

/** One line; a cell with a comma, quote or line end is quoted, quotes doubled. */
const csvLine = (cells: readonly string[]): string =>
  cells.map((c) => (/[",\r\n]/.test(c) ? `"${c.replaceAll('"', '""')}"` : c)).join(",") + LINE_END;

/** Seconds since the first sample. Within one daemon's life a stepped civil clock does not show. */
class Elapsed {
  #start: number | null = null;
  readonly #offsets = new Map<number, number>();

  at(run: number, wall_ms: number, mono_ms: number): number {
    this.#start ??= wall_ms;
    const offset = this.#offsets.get(run) ?? wall_ms - this.#start - mono_ms;
    this.#offsets.set(run, offset);
    return (mono_ms + offset) / 1000;
  }
}

function blockLines(
  parts: ReadParts,
  chunk: Chunk,
  block: Block,
  names: readonly string[],
  query: CsvQuery,
  clock: Elapsed,
): string {
  const column = (id: number): Float64Array => block.column(id) ?? new Float64Array(block.n);
  const walls = column(ROW.wall_ms);
  const monos = column(ROW.mono_ms);
  const ticks = column(ROW.tick);
  const cells = names.map((name) => cellsOf(parts, chunk, block, name));
  const { from = Number.NEGATIVE_INFINITY, to = Number.POSITIVE_INFINITY } = query;
  let text = "";
  for (let i = 0; i < block.n; i++) {
    const wall = walls[i] as number;
    if (wall < from || wall >= to) continue;
    const elapsed_s = clock.at(chunk.run, wall, monos[i] as number);
    const line = [new Date(wall).toISOString(), elapsed_s.toFixed(4), String(ticks[i])];
    for (const cell of cells) line.push(cell(i));
    text += csvLine(line);
  }
  return text;
}

/** Text of one channel's cell in row `i` of a block. */
function cellsOf(
  parts: ReadParts,
  chunk: Chunk,
  block: Block,
  name: string,
): (i: number) => string {
  const place = placeOf(parts.manifests.of(chunk.manifest), name);
  const values = place === null ? null : block.column(place.column);
  const low = block.column(ROW.freshLow);
  const high = block.column(ROW.freshHigh);
  if (place === null || values === null || low === null || high === null) return () => "";
  const words = WORDS[name];
  return (i) => {
    if (!countsFor(place, values, low, high, i)) return "";
    const count = values[i] as number;
    if (words !== undefined) return words[count] ?? String(count);
    const value = parts.convert(place.channel, count);
    return Number.isFinite(value) ? String(Number(value.toPrecision(DIGITS))) : "";
  };
}
