import type { BenchEvent } from "../model/event.ts";
import type { Manifest } from "../model/manifest.ts";
import type {
  FromRecorder,
  JournalEntry,
  SessionKind,
  StoredLatch,
  ToRecorder,
} from "../model/record-messages.ts";
import { Ring, ROW } from "../model/ring.ts";
import { encodeColumns, packColumns } from "./blocks.ts";
import { latchAfter } from "./latch.ts";
import { Levels } from "./levels.ts";
import { problemOf } from "./problem.ts";
import { rollUp } from "./rollup.ts";
import { Staging } from "./staging.ts";
import { Store, type StoredRows, type StoreOptions, type WriteOp } from "./store.ts";

/** New samples reach the disk at this pace: with the worker's own pace, under one second. */
export const COMMIT_ms = 500;
/** Packed blocks that wait for a disk that refuses them; beyond, rows are left in the ring. */
const BLOCKS_WAITING_MAX = 8;
/** Journal entries and events that wait for such a disk; later journal entries are dropped. */
const OPS_WAITING_MAX = 50_000;

/** Longest time between two samples that is not yet a gap, milliseconds, at a rate per second. */
export const gapAfter_ms = (rate_perS: number): number => Math.max(250, 5000 / rate_perS);

export interface RecorderOptions extends StoreOptions {
  readonly folder: string;
  readonly bench: string;
  readonly benchText: string;
  readonly judgeVersion: number;
  readonly ring: SharedArrayBuffer;
  /** Hears "state" once a second at most, and at once when writing begins or ceases to fail. */
  readonly tell?: (message: FromRecorder) => void;
  /** Host clocks, real ones unless a test gives its own: they pace commits and date the run. */
  readonly now_ms?: () => number;
  readonly wall_ms?: () => number;
}

type Boundary = { readonly ringRow: number; readonly apply: () => void };

/**
 * Reads the ring and the messages of the judging thread and keeps them. The worker runs it live;
 * a demo or campaign runs the same class in its own thread, calling `drain` often enough.
 */
export class Recorder {
  readonly store: Store;
  /** As the last daemon left it; what the judge starts from. */
  readonly latchAtOpen: StoredLatch | null;
  readonly lastEventId: number;
  readonly #ring: Ring;
  readonly #options: RecorderOptions;
  readonly #run: number;
  readonly #boundaries: Boundary[] = [];
  readonly #levels: Levels;
  #pending: WriteOp[] = [];
  #blocksWaiting = 0;
  #position = 0;
  #lostRows = 0;
  #lostTold = 0; // How many of them the record knows of.
  #lostEntries = 0;
  /** What the next row belongs to. */
  #benchFile: number;
  #manifest: { readonly id: number; readonly value: Manifest } | null = null;
  #session: number | null = null;
  /** What the judging thread announced last: journal entries belong to it at once. */
  #announced: {
    benchFile: number;
    manifest: number | null;
    serial: string;
    session: number | null;
  };
  #staging: Staging | null = null;
  #block = 0;
  #storedRows = 0;
  #lastWall: number | null;
  #latch: StoredLatch | null;
  #committed_ms: number;
  #told_ms = Number.NEGATIVE_INFINITY;
  #trouble = "";

  /** Opens the data folder; throws a RecordProblem that says what to do. */
  constructor(options: RecorderOptions) {
    this.#options = options;
    this.#ring = new Ring(options.ring);
    this.store = Store.open(options.folder, options);
    this.latchAtOpen = this.store.latchOf(options.bench);
    this.#latch = this.latchAtOpen;
    this.lastEventId = this.store.lastEventId;
    this.#lastWall = this.store.lastSampleOf(options.bench);
    this.#run = this.store.nextRun();
    const { bench } = options;
    this.#levels = new Levels((place) => this.store.channelId(bench, place, this.#pending));
    this.#benchFile = this.store.benchFileId(options.benchText, this.#pending);
    this.#announced = { benchFile: this.#benchFile, manifest: null, serial: "", session: null };
    this.#pending.push({
      op: "run",
      run: this.#run,
      bench,
      judgeVersion: options.judgeVersion,
      benchFile: this.#benchFile,
      at: (options.wall_ms ?? Date.now)(),
      latch: this.#latch,
    });
    this.#committed_ms = this.#now();
    try {
      this.store.write(this.#pending);
    } catch (error) {
      this.store.close();
      throw problemOf(error, options.folder);
    }
    this.#pending = [];
  }

  /** Rows of the ring taken so far, kept or lost. */
  get readRows(): number {
    return this.#position;
  }
  /** Rows that were overwritten in the ring before they could be kept. */
  get lostRows(): number {
    return this.#lostRows;
  }
  /** What stands in the way of recording, in sentences; empty while nothing does. */
  get trouble(): string {
    return this.#trouble;
  }

  /** One message of the judging thread. An event is on the disk when this returns, or `trouble` says why not. */
  take(message: ToRecorder): void {
    switch (message.kind) {
      case "open":
      case "close":
        break; // Whoever owns this recorder makes and closes it.
      case "bench":
        this.#onBench(message.ringRow, message.benchText);
        break;
      case "manifest":
        this.#onManifest(message.ringRow, message.manifest);
        break;
      case "session":
        this.#onSession(message.ringRow, message.session, message.at);
        break;
      case "event":
        this.#onEvent(message.event);
        break;
      case "journal":
        this.#onJournal(message.entry);
        break;
      case "flush":
        this.flush();
        this.#options.tell?.({ kind: "flushed", id: message.id });
        break;
      default:
        message satisfies never;
    }
  }

  /** Takes rows of the ring up to `limit` (all there are, where none is given); commits when due. */
  drain(limit: number = this.#ring.written): void {
    while (this.#position < limit) {
      this.#skipOverwritten();
      this.#applyBoundaries();
      if (this.#blocksWaiting >= BLOCKS_WAITING_MAX) {
        // While the disk refuses, it is asked at the usual pace only; the ring holds the rest.
        if (this.#trouble !== "" || !this.#commit()) break;
      }
      this.#takeRow();
    }
    this.#skipOverwritten();
    const now = this.#now();
    if (now - this.#committed_ms >= COMMIT_ms) this.#commit();
    if (now - this.#told_ms >= 1000) this.#tellState(now);
  }

  /** Everything there is, to the disk. False where that failed; `trouble` says why. */
  flush(): boolean {
    this.drain();
    this.#applyBoundaries();
    return this.#commit();
  }

  /** Ends the session and packs the last block, then gives the folder free. */
  close(): void {
    this.flush();
    this.#endSession((this.#options.wall_ms ?? Date.now)());
    this.#commit();
    this.store.close();
  }

  #now(): number {
    return (this.#options.now_ms ?? performance.now.bind(performance))();
  }

  #onBench(ringRow: number, text: string): void {
    const benchFile = this.store.benchFileId(text, this.#pending);
    this.#announced.benchFile = benchFile;
    this.#at(ringRow, () => {
      this.#finishBlock();
      this.#benchFile = benchFile;
    });
  }

  #onManifest(ringRow: number, value: Manifest): void {
    const id = this.store.manifestId(value, this.#pending);
    this.#announced.manifest = id;
    this.#announced.serial = value.serial;
    this.#at(ringRow, () => {
      this.#finishBlock();
      this.#manifest = { id, value };
      this.#staging = null;
    });
  }

  #onSession(ringRow: number, kind: SessionKind | "end", at: number): void {
    const before = this.#announced.session;
    if (before !== null) this.#pending.push({ op: "session-end", session: before, at });
    const session = kind === "end" ? null : this.#beginSession(kind, at, this.#announced.benchFile);
    this.#announced.session = session;
    this.#at(ringRow, () => {
      this.#finishBlock();
      // One that was begun for samples that came between two sessions.
      if (this.#session !== before) this.#endSession(at);
      this.#session = session;
    });
  }

  #beginSession(kind: SessionKind, at: number, benchFile: number): number {
    const session = this.store.nextSession();
    const { bench } = this.#options;
    this.#pending.push({ op: "session", session, run: this.#run, bench, kind, benchFile, at });
    return session;
  }

  #onEvent(event: BenchEvent): void {
    this.#pending.push({ op: "event", run: this.#run, event });
    const latch = latchAfter(this.#latch, event, this.#announced.serial);
    if (latch !== null) {
      this.#latch = latch;
      this.#pending.push({ op: "latch", bench: this.#options.bench, latch });
    }
    this.#commit();
  }

  #onJournal(entry: JournalEntry): void {
    if (this.#pending.length >= OPS_WAITING_MAX) {
      this.#lostEntries++;
      return;
    }
    const { benchFile, manifest } = this.#announced;
    this.#pending.push({ op: "journal", run: this.#run, entry, benchFile, manifest });
  }

  #at(ringRow: number, apply: () => void): void {
    this.#boundaries.push({ ringRow, apply });
  }

  #applyBoundaries(): void {
    for (let next = this.#boundaries[0]; next !== undefined; next = this.#boundaries[0]) {
      if (next.ringRow > this.#position) return;
      this.#boundaries.shift();
      next.apply();
    }
  }

  /** The writer may be filling the slot of row `written − rows` at this moment. */
  #skipOverwritten(): void {
    const safe = this.#ring.written - this.#ring.rows + 1;
    if (this.#position < safe) this.#lose(safe - this.#position);
  }

  #lose(rows: number): void {
    this.#position += rows;
    this.#lostRows += rows;
  }

  #takeRow(): void {
    const manifest = this.#manifest;
    if (manifest === null) {
      this.#lose(1);
      return;
    }
    const cells = this.#ring.cells;
    const at = this.#ring.offset(this.#position);
    const wall = cells[at + ROW.wall_ms] as number;
    this.#session ??= this.#beginSession("dark", wall, this.#benchFile);
    if (this.#staging !== null && !this.#staging.accepts(cells, at)) this.#finishBlock();
    this.#staging ??= new Staging(manifest.value);
    if (this.#staging.n === 0) this.#block = this.store.nextBlock();
    this.#staging.push(cells, at);
    if (this.#ring.written - this.#position >= this.#ring.rows) {
      this.#staging.n--;
      this.#lose(1);
      return;
    }
    this.#position++;
    this.#noteGap(wall, manifest.value.rate_perS);
  }

  #noteGap(wall: number, rate_perS: number): void {
    const before = this.#lastWall;
    this.#lastWall = wall;
    if (before === null || wall - before <= gapAfter_ms(rate_perS)) return;
    const { bench } = this.#options;
    this.#pending.push({ op: "gap", bench, from_wall_ms: before, to_wall_ms: wall });
  }

  /** Rows from `from` on, whole blocks packed, chunks of the tail as they are. */
  #rowsOf(staging: Staging, from: number, pack: typeof packColumns): StoredRows | null {
    if (this.#session === null || this.#manifest === null) return null;
    return {
      block: this.#block,
      session: this.#session,
      run: this.#run,
      manifest: this.#manifest.id,
      benchFile: this.#benchFile,
      ...staging.bounds(from, staging.n),
      n: staging.n - from,
      coded: pack(staging.columns, from, staging.n),
    };
  }

  #finishBlock(): void {
    const staging = this.#staging;
    if (staging === null || staging.n === 0) return;
    const rows = this.#rowsOf(staging, 0, packColumns);
    if (rows !== null) {
      const seconds = rollUp(staging, staging.manifest);
      const { minutes, sealed } = this.#levels.add(rows, seconds, staging.manifest);
      this.#pending.push({ op: "block", rows, minutes, unseen: staging.n - this.#storedRows });
      for (const row of sealed) this.#pending.push({ op: "rollup", row });
      this.#blocksWaiting++;
    }
    staging.clear();
    this.#storedRows = 0;
  }

  #endSession(at: number): void {
    this.#finishBlock();
    const session = this.#session;
    if (session !== null) this.#pending.push({ op: "session-end", session, at });
    this.#session = null;
  }

  #commit(): boolean {
    this.#committed_ms = this.#now();
    const staging = this.#staging;
    const unstored = staging !== null && staging.n > this.#storedRows;
    const rows = unstored ? this.#rowsOf(staging, this.#storedRows, encodeColumns) : null;
    const ops = [...this.#pending];
    if (rows !== null) ops.push({ op: "tail", rows });
    for (const row of this.#levels.growing()) ops.push({ op: "rollup", row });
    const samples = this.#lostRows;
    if (samples > this.#lostTold) ops.push({ op: "lost", run: this.#run, samples });
    try {
      this.store.write(ops);
    } catch (error) {
      this.#failed(error);
      return false;
    }
    this.#pending = [];
    this.#blocksWaiting = 0;
    this.#levels.wrote();
    this.#lostTold = samples;
    if (staging !== null) this.#storedRows = staging.n;
    if (this.#trouble !== "") {
      this.#trouble = "";
      this.#tellState(this.#committed_ms);
    }
    return true;
  }

  #failed(error: unknown): void {
    const before = this.#trouble;
    this.#trouble = problemOf(error, this.#options.folder).message;
    if (before !== this.#trouble) this.#tellState(this.#committed_ms);
  }

  #tellState(now: number): void {
    this.#told_ms = now;
    this.#options.tell?.({
      kind: "state",
      readRows: this.#position,
      lostRows: this.#lostRows,
      failing: this.#trouble !== "",
      words: this.#words(),
    });
  }

  #words(): string {
    const lost = this.#lostRows === 0 ? "" : ` ${this.#lostRows} samples of this run are lost.`;
    const entries = this.#lostEntries === 0 ? "" : ` ${this.#lostEntries} inputs are lost.`;
    const faults = this.store.faults
      .map((fault) => ` Samples of an earlier session cannot be read (${fault}); the rest is kept.`)
      .join("");
    return `${this.#trouble}${lost}${entries}${faults}`.trim();
  }
}
