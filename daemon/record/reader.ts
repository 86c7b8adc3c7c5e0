import type Database from "better-sqlite3";
import type { Epoch } from "../model/epoch.ts";
import type { BenchEvent } from "../model/event.ts";
import type { Channel, Manifest } from "../model/manifest.ts";
import type { Reading } from "../model/reading.ts";
import type { SessionKind, StoredLatch } from "../model/record-messages.ts";
import type { SeriesAnswer, SeriesQuery, SeriesStore } from "../model/series.ts";
import { mono, type Wall_ms, wall } from "../model/times.ts";
import { epochsOf, eventsByHand, readingsOf } from "./by-hand.ts";
import { type ChunkFilter, ChunkIndex, Manifests } from "./chunks.ts";
import { placesOf } from "./columns.ts";
import { openForReading } from "./folder.ts";
import { inputsOf, type RecordedInput } from "./inputs.ts";
import { type LatchRow, latchFrom } from "./latch.ts";
import { answerSeries } from "./series.ts";

/**
 * Units from counts: a pure function of the channel and a count, which may lie between two whole
 * ones (a mean). The bench file's conversions come in here, so that a better calibration re-reads
 * old nights. Must be monotonic over the channel's range.
 */
export type Converter = (channel: Channel, counts: number) => number;

/** The manifest's own scale: value = counts × perCount. */
export const byManifest: Converter = (channel, counts) => counts * channel.perCount;

/** The same converter, but for what came from elsewhere in units of its own. */
const keepingUnits =
  (convert: Converter): Converter =>
  (channel, counts) =>
    channel.inUnit === true ? byManifest(channel, counts) : convert(channel, counts);

/** A session as the record knows it. `ended` is null while it is being recorded. */
export interface SessionRow {
  readonly id: number;
  readonly run: number;
  readonly bench: string;
  readonly kind: SessionKind;
  readonly started: Wall_ms;
  readonly ended: Wall_ms | null;
  /** Time of the last sample kept so far. */
  readonly last: Wall_ms;
  readonly samples: number;
  readonly benchFile: number;
}

/** One life of a daemon: the judge began afresh with `latch`, so a replay begins here. */
export interface RunRow {
  readonly id: number;
  readonly bench: string;
  readonly judgeVersion: number;
  readonly started: Wall_ms;
  readonly latch: StoredLatch | null;
  /** Samples that the recorder could not keep: a replay of this run is not whole where above 0. */
  readonly lostSamples: number;
}

export interface TimeWindow {
  readonly from: Wall_ms;
  readonly to: Wall_ms;
}

/** Opens a data folder for reading, also while a daemon writes. Throws a RecordProblem. */
export const openReader = (folder: string, convert: Converter = byManifest): RecordReader =>
  new RecordReader(openForReading(folder), convert);

/**
 * The read side: never writes, and never holds a read transaction for longer than it takes to list
 * blocks, so that the writer's log can be given back.
 */
export class RecordReader implements SeriesStore {
  /** Blocks that could not be read so far, each named; their samples are left out. */
  readonly faults = new Set<string>();
  readonly #db: Database.Database;
  readonly #convert: Converter;
  readonly #manifests: Manifests;

  constructor(db: Database.Database, convert: Converter) {
    this.#db = db;
    this.#convert = keepingUnits(convert);
    this.#manifests = new Manifests(db);
  }

  /**
   * Per pixel min, mean, max and n, in units; every single sample where the window holds at most
   * two a pixel. Reads one-second rollups where a pixel is a second or more. Unknown channels give
   * empty traces. Rejects with the signal's reason when aborted.
   */
  series(
    query: SeriesQuery,
    signal?: AbortSignal,
    convert: Converter = this.#convert,
  ): Promise<SeriesAnswer> {
    return answerSeries({ ...this.#parts(), convert: keepingUnits(convert) }, query, signal);
  }

  /**
   * Events of a window (to not included), in order of their ids. What people did by hand (changes,
   * typed readings) stands among them by its time, under negative numbers.
   */
  events(window: TimeWindow, bench?: string): BenchEvent[] {
    const judged = this.#judged(window, bench);
    const byHand = eventsByHand(this.#db, bench ?? null, window);
    return byHand.length === 0 ? judged : [...judged, ...byHand].sort((a, b) => a.wall - b.wall);
  }

  /** Changes by hand, oldest first. */
  epochs(bench?: string): Epoch[] {
    return epochsOf(this.#db, bench ?? null);
  }

  /** Readings of witnesses, oldest first. */
  readings(bench?: string): Reading[] {
    return readingsOf(this.#db, bench ?? null, null);
  }

  #judged(window: TimeWindow, bench?: string): BenchEvent[] {
    const rows = this.#db
      .prepare(
        `SELECT id, bench, input, tick, mono_ms, wall_ms, kind, hazard, data FROM events
         WHERE wall_ms >= @from AND wall_ms < @to AND (@bench IS NULL OR bench = @bench)
         ORDER BY id`,
      )
      .all({ from: window.from, to: window.to, bench: bench ?? null }) as EventRow[];
    return rows.map(eventFrom);
  }

  /** Events of one run, in order of their ids. */
  eventsOfRun(run: number): BenchEvent[] {
    const rows = this.#db.prepare("SELECT * FROM events WHERE run = ? ORDER BY id").all(run);
    return (rows as EventRow[]).map(eventFrom);
  }

  /** Sessions by start, oldest first. */
  sessions(): SessionRow[] {
    return this.#db
      .prepare(
        `SELECT id, run, bench, kind, started_wall_ms AS started, ended_wall_ms AS ended,
         last_wall_ms AS last, samples, bench_file AS benchFile FROM sessions
         ORDER BY started_wall_ms, id`,
      )
      .all() as SessionRow[];
  }

  /** Lives of the daemon, oldest first. */
  runs(): RunRow[] {
    const rows = this.#db.prepare("SELECT * FROM runs ORDER BY id").all() as StoredRun[];
    return rows.map((row) => ({
      id: row.id,
      bench: row.bench,
      judgeVersion: row.judge_version,
      started: wall(row.started_wall_ms),
      latch:
        row.latch_cause === null
          ? null
          : latchFrom({
              cause: row.latch_cause,
              wall_ms: row.latch_wall_ms ?? 0,
              serial: row.latch_serial ?? "",
              lit: row.latch_lit ?? 0,
            }),
      lostSamples: row.lost_samples,
    }));
  }

  /** Every input of the judge in one run, in order, as the judge got it. The record is reused. */
  inputs(run: number): Generator<RecordedInput> {
    return inputsOf({ ...this.#parts(), convert: this.#convert }, run);
  }

  /** The latch as it stands, or null for a bench never armed. */
  latestLatch(bench: string): StoredLatch | null {
    const row = this.#db.prepare("SELECT * FROM latch WHERE bench = ?").get(bench);
    return row === undefined ? null : latchFrom(row as LatchRow);
  }

  /** Text of a bench file by its row id. */
  benchText(benchFile: number): string {
    return String(
      this.#db.prepare("SELECT text FROM bench_files WHERE id = ?").pluck().get(benchFile),
    );
  }

  /** Text of the bench file by which the last input was judged, or null in an empty record. */
  lastBenchText(): string | null {
    const last = (from: string): unknown =>
      this.#db.prepare(`SELECT text FROM ${from} LIMIT 1`).pluck().get();
    // A record that was fetched from elsewhere has no journal.
    const text =
      last(`journal JOIN bench_files ON bench_files.id = journal.bench_file
        ORDER BY run DESC, input DESC`) ??
      last(`sessions JOIN bench_files ON bench_files.id = sessions.bench_file
        ORDER BY sessions.id DESC`);
    return typeof text === "string" ? text : null;
  }

  manifest(id: number): Manifest {
    return this.#manifests.of(id);
  }

  /** Channels that some sample of the filter's stretch has, each once, the controller's first. */
  channels(filter: ChunkFilter = {}): Channel[] {
    const index = new ChunkIndex(this.#db, filter);
    const found = new Map<string, Channel>();
    for (const id of new Set(index.chunks.map((chunk) => chunk.manifest))) {
      for (const { channel } of placesOf(this.#manifests.of(id))) found.set(channel.name, channel);
    }
    const all = [...found.values()];
    return [...all.filter((c) => c.index >= 0), ...all.filter((c) => c.index < 0)];
  }

  /** What export.ts and the like read from. */
  parts(): ReadParts {
    return { ...this.#parts(), convert: this.#convert };
  }

  close(): void {
    this.#db.close();
  }

  #parts(): Omit<ReadParts, "convert"> {
    return { db: this.#db, manifests: this.#manifests, faults: this.faults };
  }
}

/** What every question to the record needs. */
export interface ReadParts {
  readonly db: Database.Database;
  readonly manifests: Manifests;
  readonly faults: Set<string>;
  readonly convert: Converter;
}

interface EventRow {
  readonly id: number;
  readonly bench: string;
  readonly input: number;
  readonly tick: number;
  readonly mono_ms: number;
  readonly wall_ms: number;
  readonly kind: BenchEvent["kind"];
  readonly hazard: string;
  readonly data: string;
}

const eventFrom = (row: EventRow): BenchEvent => ({
  id: row.id,
  bench: row.bench,
  input: row.input,
  tick: row.tick,
  mono: mono(row.mono_ms),
  wall: wall(row.wall_ms),
  kind: row.kind,
  hazard: row.hazard,
  // JSON has no NaN: a number that was not known was written as null.
  data: JSON.parse(row.data, (_key, value) =>
    value === null ? Number.NaN : value,
  ) as BenchEvent["data"],
});

interface StoredRun {
  readonly id: number;
  readonly bench: string;
  readonly judge_version: number;
  readonly started_wall_ms: number;
  readonly latch_cause: number | null;
  readonly latch_wall_ms: number | null;
  readonly latch_serial: string | null;
  readonly latch_lit: number | null;
  readonly lost_samples: number;
}
