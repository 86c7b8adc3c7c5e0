import { crc32 } from "node:zlib";
import type { Channel, Manifest } from "../model/manifest.ts";
import { Ring, ROW, ROW_LENGTH, ringBytes } from "../model/ring.ts";
import { mono, wall } from "../model/times.ts";
import { type ColumnMap, columnMap, type MappedChannel } from "./import-map.ts";
import { type BadRow, type GoodRow, RowReader } from "./import-rows.ts";
import { openSource, type Source } from "./import-source.ts";
import { type TimeRule, Times } from "./import-times.ts";
import { RecordProblem } from "./problem.ts";
import { Recorder } from "./recorder.ts";

/** What is to be imported, and how it is meant. */
export interface ImportRequest {
  readonly file: string;
  /** The text of `--map`; undefined where the columns' own names say it. */
  readonly map: string | undefined;
  readonly times: Omit<TimeRule, "unit">;
  readonly bench: string;
}

/** What came of it. */
export interface Imported {
  readonly rows: number;
  readonly badRows: number;
  /** The first of them, by line. */
  readonly bad: readonly BadRow[];
  readonly from_ms: number;
  readonly to_ms: number;
  readonly rate_perS: number;
  readonly channels: readonly { readonly name: string; readonly unit: string }[];
}

/** What a first reading of the file tells: how fine its numbers are, and how far apart its rows. */
interface Survey {
  readonly rows: number;
  readonly from_ms: number;
  readonly to_ms: number;
  readonly step_ms: number;
  readonly channels: readonly ScaledChannel[];
  readonly reader: RowReader;
}

/** A channel, and the counts that one number of the file stands for. */
interface ScaledChannel {
  readonly channel: Channel;
  readonly countsPerNumber: number;
}

/** Decimals kept of a number, and the largest count that a channel can have. */
const DECIMALS_MAX = 9;
const COUNT_MAX = 2 ** 31 - 2;
/** Rows whose distances tell the rate. */
const STEPS_LOOKED_AT = 20_000;
const RING_ROWS = 4096;

/**
 * Reads a CSV or Parquet file from elsewhere into a record of its own in `scratch`, as one session
 * of kind watched: whole counts, with the scale that keeps every decimal. Bad rows are left out and
 * named by line. Throws a RecordProblem where the file as a whole cannot be read so.
 */
export async function importFile(
  request: ImportRequest,
  scratch: string,
  progress: (part: number) => void,
  signal: AbortSignal,
): Promise<Imported> {
  const source = await openSource(request.file);
  const map = columnMap(request.map, source.columns);
  const times = new Times({ ...request.times, unit: map.timeUnit });
  const survey = await look(source, map, times, (part) => progress(part / 2), signal);
  await record(request, scratch, survey, new RowReader(source, map, times), (part) => {
    progress(0.5 + part / 2);
    signal.throwIfAborted();
  });
  return {
    rows: survey.rows,
    badRows: survey.reader.badCount,
    bad: survey.reader.bad,
    from_ms: survey.from_ms,
    to_ms: survey.to_ms,
    rate_perS: 1000 / survey.step_ms,
    channels: survey.channels.map(({ channel: { name, unit } }) => ({ name, unit })),
  };
}

async function look(
  source: Source,
  map: ColumnMap,
  times: Times,
  progress: (part: number) => void,
  signal: AbortSignal,
): Promise<Survey> {
  const reader = new RowReader(source, map, times);
  const fineness = map.channels.map(() => new Fineness());
  const steps: number[] = [];
  let rows = 0;
  let from_ms = Number.NaN;
  let to_ms = Number.NaN;
  for await (const batch of reader.rows(progress)) {
    signal.throwIfAborted();
    for (const { wall_ms, values } of batch) {
      if (rows === 0) from_ms = wall_ms;
      else if (steps.length < STEPS_LOOKED_AT) steps.push(wall_ms - to_ms);
      to_ms = wall_ms;
      rows++;
      for (const [i, fine] of fineness.entries()) fine.add(values[i] as number);
    }
  }
  if (rows < 2) throw nothing(reader);
  steps.sort((a, b) => a - b);
  const channels = map.channels.map((channel, i) =>
    channelFrom(channel, i, fineness[i] as Fineness),
  );
  const step_ms = steps[Math.floor(steps.length / 2)] as number;
  return { rows, from_ms, to_ms, step_ms, channels, reader };
}

function nothing({ bad, badCount }: RowReader): RecordProblem {
  const first = bad[0];
  return new RecordProblem(
    "No two rows of this file can be used.",
    first === undefined
      ? "It has no rows."
      : `Line ${first.line}: ${first.why}; ${badCount} rows are like that or otherwise bad.`,
    "Look at --map, --zone and --start. Nothing was changed.",
  );
}

/** How many decimals a channel's numbers have, and how large they are. */
class Fineness {
  decimals = 0;
  largest = 0;

  add(value: number): void {
    if (!Number.isFinite(value)) return;
    this.largest = Math.max(this.largest, Math.abs(value));
    while (this.decimals < DECIMALS_MAX && !this.#isWhole(value)) this.decimals++;
  }

  #isWhole(value: number): boolean {
    const scaled = value * 10 ** this.decimals;
    return Math.abs(scaled - Math.round(scaled)) <= Math.abs(scaled) * 1e-14;
  }
}

/** A channel whose counts hold every decimal that there is room for. */
function channelFrom(mapped: MappedChannel, index: number, fine: Fineness): ScaledChannel {
  let { decimals } = fine;
  while (fine.largest * 10 ** decimals > COUNT_MAX) decimals--;
  const channel: Channel = {
    index,
    name: mapped.name,
    unit: mapped.unit,
    perCount: Number(`1e${mapped.power - decimals}`) * mapped.times,
    count_min: -COUNT_MAX,
    count_max: COUNT_MAX,
    group: 0,
    inUnit: true,
  };
  return { channel, countsPerNumber: 10 ** decimals };
}

async function record(
  request: ImportRequest,
  folder: string,
  survey: Survey,
  reader: RowReader,
  progress: (part: number) => void,
): Promise<void> {
  const ring = new Ring(new SharedArrayBuffer(ringBytes(RING_ROWS)));
  const { from_ms, channels } = survey;
  const recorder = new Recorder({
    folder,
    bench: request.bench,
    benchText: `# Imported; no bench file belongs to it.\nname: ${request.bench}\n`,
    judgeVersion: 0,
    ring: ring.memory,
    durability: "none",
    wall_ms: () => from_ms,
  });
  try {
    recorder.take({ kind: "manifest", ringRow: 0, manifest: manifestOf(survey) });
    recorder.take({ kind: "session", ringRow: 0, session: "watched", at: wall(from_ms) });
    recorder.take({ kind: "event", event: eventOf(request, survey) });
    let n = 0;
    for await (const batch of reader.rows(progress)) {
      for (const row of batch) {
        fill(ring, row, n++, from_ms, channels);
        if (n % (RING_ROWS / 2) === 0) recorder.drain();
      }
    }
    recorder.drain();
    const end = { kind: "session", session: "end", at: wall(survey.to_ms) } as const;
    recorder.take({ ...end, ringRow: n });
  } finally {
    recorder.close();
  }
}

function manifestOf({ channels, step_ms }: Survey): Manifest {
  const described = channels.map(({ channel }) => channel);
  return {
    id: crc32(JSON.stringify(described)).toString(16).padStart(8, "0"),
    protocol: 0,
    firmware: "imported",
    serial: "",
    boot: 0,
    tick_us: 1000,
    absolute_counts: 0,
    curveCrc: "00000000",
    term_ticks_min: 0,
    term_ticks_max: 0,
    fall_ms: 0,
    rate_perS: 1000 / step_ms,
    capabilities: [],
    channels: described,
  };
}

function eventOf({ file, bench }: ImportRequest, { rows, from_ms, reader }: Survey) {
  const name = file.slice(file.lastIndexOf("/") + 1);
  const left = reader.badCount === 0 ? "" : `; ${reader.badCount} rows could not be used`;
  return {
    ...{ id: 1, bench, input: 0, tick: -1, mono: mono(0), wall: wall(from_ms) },
    ...({ kind: "record", hazard: "" } as const),
    data: { words: `Imported from ${name}: ${rows} rows${left}.`, weight: "calm" },
  };
}

/** One row as the loop would have written it; what a judge would have known is not known. */
function fill(
  ring: Ring,
  { wall_ms, values }: GoodRow,
  n: number,
  from_ms: number,
  channels: readonly ScaledChannel[],
): void {
  const { cells } = ring;
  const at = ring.offset(n);
  cells.fill(0, at, at + ROW_LENGTH);
  const set = (cell: number, value: number): void => {
    cells[at + cell] = value;
  };
  set(ROW.input, n + 1);
  set(ROW.mono_ms, wall_ms - from_ms);
  set(ROW.wall_ms, wall_ms);
  set(ROW.seq, n);
  set(ROW.tick, Math.round(wall_ms - from_ms) % 2 ** 32);
  set(ROW.ackSeq, -1);
  set(ROW.ackAge_ticks, -1);
  for (const cell of NOT_JUDGED) set(cell, Number.NaN);
  let low = 0;
  let high = 0;
  for (const [i, { countsPerNumber }] of channels.entries()) {
    const value = values[i] as number;
    if (!Number.isFinite(value)) continue;
    set(ROW.values + i, Math.round(value * countsPerNumber) + 0);
    if (i < 32) low |= 1 << i;
    else high |= 1 << (i - 32);
  }
  set(ROW.freshLow, low >>> 0);
  set(ROW.freshHigh, high >>> 0);
  ring.publish();
}

const NOT_JUDGED: readonly number[] = [
  ...[ROW.state, ROW.flags, ROW.asked_mA, ROW.aim_mA, ROW.ceiling_mA],
  ...[ROW.maker, ROW.floor_mA, ROW.expected_mW],
];
