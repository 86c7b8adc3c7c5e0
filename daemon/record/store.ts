import { createHash } from "node:crypto";
import type Database from "better-sqlite3";
import type { BenchEvent } from "../model/event.ts";
import type { Manifest } from "../model/manifest.ts";
import type { JournalEntry, SessionKind, StoredLatch } from "../model/record-messages.ts";
import type { Coded } from "./blocks.ts";
import type { ChannelPlace } from "./columns.ts";
import { closeWritten, type FolderLock, lockFolder, openForWriting } from "./folder.ts";
import { type LatchRow, latchFrom } from "./latch.ts";
import {
  type ChannelId,
  type MinuteStats,
  type RollupRow,
  rollMinutes,
  rollUnrolled,
  rollupValues,
  statsValues,
  UPSERT_ROLLUP,
  upsertStats,
} from "./levels.ts";
import { errorCode, problemOf } from "./problem.ts";
import { repairTail } from "./repair.ts";
import type { BlockIdentity } from "./staging.ts";

/** Rows of a block or of a chunk of the growing one: where they are in time, and their bytes. */
export interface StoredRows extends BlockIdentity {
  readonly t0: number;
  readonly t1: number;
  readonly input0: number;
  readonly input1: number;
  readonly n: number;
  readonly coded: Coded;
}

/** One thing to write. Ops are data, so that what could not be written is tried again unchanged. */
export type WriteOp =
  | {
      readonly op: "run";
      readonly run: number;
      readonly bench: string;
      readonly judgeVersion: number;
      readonly benchFile: number;
      readonly at: number;
      readonly latch: StoredLatch | null;
    }
  | { readonly op: "bench-file"; readonly id: number; readonly text: string }
  | { readonly op: "manifest"; readonly id: number; readonly manifest: Manifest }
  | {
      readonly op: "session";
      readonly session: number;
      readonly run: number;
      readonly bench: string;
      readonly kind: SessionKind;
      readonly benchFile: number;
      readonly at: number;
    }
  | { readonly op: "session-end"; readonly session: number; readonly at: number }
  | { readonly op: "event"; readonly run: number; readonly event: BenchEvent }
  | {
      readonly op: "journal";
      readonly run: number;
      readonly entry: JournalEntry;
      readonly benchFile: number;
      readonly manifest: number | null;
    }
  | { readonly op: "tail"; readonly rows: StoredRows }
  /** `unseen` of its rows were in no chunk of the tail; its rollups are in the same write. */
  | {
      readonly op: "block";
      readonly rows: StoredRows;
      readonly minutes: readonly MinuteStats[];
      readonly unseen: number;
    }
  | { readonly op: "rollup"; readonly row: RollupRow }
  | { readonly op: "channel"; readonly id: number; readonly key: ChannelKey }
  | {
      readonly op: "gap";
      readonly bench: string;
      readonly from_wall_ms: number;
      readonly to_wall_ms: number;
    }
  | { readonly op: "lost"; readonly run: number; readonly samples: number }
  | { readonly op: "latch"; readonly bench: string; readonly latch: StoredLatch };

export interface StoreOptions {
  /** "power-cut" (the default) syncs each commit to the disk; "none" is for simulations only. */
  readonly durability?: "power-cut" | "none";
}

const STATEMENTS = {
  run: `INSERT INTO runs (id, bench, judge_version, bench_file, started_wall_ms,
    latch_cause, latch_wall_ms, latch_serial, latch_lit) VALUES (?,?,?,?,?,?,?,?,?)`,
  "bench-file": "INSERT INTO bench_files (id, hash, text) VALUES (?,?,?)",
  manifest: "INSERT INTO manifests (id, crc, json) VALUES (?,?,?)",
  session: `INSERT INTO sessions (id, run, bench, kind, bench_file, started_wall_ms, last_wall_ms)
    VALUES (?,?,?,?,?,?,?)`,
  "session-end": "UPDATE sessions SET ended_wall_ms = ? WHERE id = ?",
  event: `INSERT INTO events (id, run, bench, input, tick, mono_ms, wall_ms, kind, hazard, data)
    VALUES (?,?,?,?,?,?,?,?,?,?)`,
  journal: "INSERT OR REPLACE INTO journal VALUES (?,?,?,?,?,?,?,?,?,?,?,?)",
  tail: `INSERT INTO tail (block, session, run, t0, t1, input0, input1, n, manifest, bench_file,
    codec, crc, blob) VALUES (?,?,?,?,?,?,?,?,?,?,?,?,?)`,
  seen: `UPDATE sessions SET samples = samples + ?, last_wall_ms = max(last_wall_ms, ?)
    WHERE id = ?`,
  block: `INSERT INTO blocks (id, session, run, t0, t1, input0, input1, n, manifest, bench_file,
    codec, crc, blob, rolled) VALUES (?,?,?,?,?,?,?,?,?,?,?,?,?,1)`,
  rollup: UPSERT_ROLLUP,
  minute: upsertStats("rollup_1min", "minute"),
  hour: upsertStats("rollup_1h", "hour"),
  channel: "INSERT INTO channels (id, bench, name, unit, per_count) VALUES (?,?,?,?,?)",
  tailDone: "DELETE FROM tail WHERE block = ?",
  gap: "INSERT INTO gaps (bench, from_wall_ms, to_wall_ms) VALUES (?,?,?)",
  lost: "UPDATE runs SET lost_samples = ? WHERE id = ?",
  latch: "INSERT OR REPLACE INTO latch (bench, cause, wall_ms, serial, lit) VALUES (?,?,?,?,?)",
} as const;
type StatementName = keyof typeof STATEMENTS;

/**
 * The write side of a data folder. There is at most one, for the folder is locked while it is open.
 * Ids are counted here, in memory, so that a write that failed can be repeated as it was.
 */
export class Store {
  readonly folder: string;
  /** Chunks of an earlier, killed recorder that could not be read when this store was opened. */
  readonly faults: readonly string[];
  readonly #lock: FolderLock;
  readonly #db: Database.Database;
  readonly #statements: Record<StatementName, Database.Statement>;
  readonly #write: (ops: readonly WriteOp[]) => void;
  readonly #next: { run: number; session: number; block: number };
  readonly #benchFiles: Map<string, number>;
  readonly #manifests: Map<string, number>;
  readonly #channels: Map<string, number>;

  private constructor(folder: string, lock: FolderLock, db: Database.Database) {
    this.folder = folder;
    this.faults = repairTail(db);
    this.#lock = lock;
    this.#db = db;
    this.#statements = Object.fromEntries(
      Object.entries(STATEMENTS).map(([name, sql]) => [name, db.prepare(sql)]),
    ) as Record<StatementName, Database.Statement>;
    this.#write = db.transaction((ops: readonly WriteOp[]) => {
      for (const op of ops) this.#apply(op);
    }).immediate;
    this.#next = {
      run: this.#max("runs") + 1,
      session: this.#max("sessions") + 1,
      block: this.#max("blocks") + 1,
    };
    const files = db.prepare("SELECT id, text FROM bench_files").all() as FileRow[];
    this.#benchFiles = new Map(files.map((row) => [row.text, row.id]));
    const manifests = db.prepare("SELECT id, json AS text FROM manifests").all() as FileRow[];
    this.#manifests = new Map(manifests.map((row) => [row.text, row.id]));
    const channels = db.prepare("SELECT id, bench, name, unit, per_count FROM channels");
    this.#channels = new Map(
      (channels.raw().all() as ChannelRow[]).map(([id, ...key]) => [JSON.stringify(key), id]),
    );
    this.rollUp();
  }

  /**
   * Opens a data folder for writing: takes its lock, makes or migrates its file, and packs what a
   * killed recorder left unpacked. Throws a RecordProblem that says what to do.
   */
  static open(folder: string, options: StoreOptions = {}): Store {
    const lock = lockFolder(folder);
    let db: Database.Database | null = null;
    try {
      db = openForWriting(folder, options.durability ?? "power-cut");
      return new Store(folder, lock, db);
    } catch (error) {
      db?.close();
      lock.release();
      throw problemOf(error, folder);
    }
  }

  /** Writes all of `ops` or, where it throws, none of them. Durable when it returns. */
  write(ops: readonly WriteOp[]): void {
    if (ops.length > 0) this.#write(ops);
  }

  /**
   * Runs `work` on the record as one transaction: all of it, or where it throws, nothing. For what
   * a person keeps beside the samples (notes, packs that come back); it must be over in an instant.
   */
  within<T>(work: (db: Database.Database) => T): T {
    return this.#db.transaction(() => work(this.#db)).immediate();
  }

  nextRun(): number {
    return this.#next.run++;
  }
  nextSession(): number {
    return this.#next.session++;
  }
  nextBlock(): number {
    return this.#next.block++;
  }

  /** Row id of a bench file's text; where it is new, an op that stores it is added to `ops`. */
  benchFileId(text: string, ops: WriteOp[]): number {
    return idOf(this.#benchFiles, text, (id) => ops.push({ op: "bench-file", id, text }));
  }

  /** Row id of a manifest; where it is new, an op that stores it is added to `ops`. */
  manifestId(manifest: Manifest, ops: WriteOp[]): number {
    const json = JSON.stringify(manifest);
    return idOf(this.#manifests, json, (id) => ops.push({ op: "manifest", id, manifest }));
  }

  /** Row id of a bench's channel; where it is new, an op that stores it is added to `ops`. */
  channelId(bench: string, { channel }: ChannelPlace, ops: WriteOp[]): number {
    const key = JSON.stringify([bench, channel.name, channel.unit, channel.perCount]);
    return idOf(this.#channels, key, (id) => ops.push({ op: "channel", id, key }));
  }

  /** Makes rollups of blocks that came without them, of so many at once; answers of how many. */
  rollUp(): number {
    const roll = (): number => rollUnrolled(this.#db, (bench) => this.#channelsOf(bench));
    return this.#db.transaction(roll).immediate();
  }

  /** Makes the minute's and hour's statistics of a session that came with its other rollups. */
  rollMinutes(session: number): void {
    const roll = (): void => rollMinutes(this.#db, session, (bench) => this.#channelsOf(bench));
    this.#db.transaction(roll)();
  }

  #channelsOf(bench: string): ChannelId {
    return (place) => {
      const ops: WriteOp[] = [];
      const id = this.channelId(bench, place, ops);
      for (const op of ops) this.#apply(op);
      return id;
    };
  }

  get lastEventId(): number {
    return this.#max("events");
  }

  /** The latch of a bench as the last daemon left it; null for a bench never armed. */
  latchOf(bench: string): StoredLatch | null {
    const row = this.#db
      .prepare("SELECT cause, wall_ms, serial, lit FROM latch WHERE bench = ?")
      .get(bench) as LatchRow | undefined;
    return row === undefined ? null : latchFrom(row);
  }

  /** Civil time of the last sample kept of a bench, or null. */
  lastSampleOf(bench: string): number | null {
    const row = this.#db
      .prepare("SELECT max(last_wall_ms) AS at FROM sessions WHERE bench = ? AND samples > 0")
      .get(bench) as { at: number | null };
    return row.at;
  }

  /** Closes the file and gives the folder free. */
  close(): void {
    try {
      closeWritten(this.#db);
    } finally {
      this.#lock.release();
    }
  }

  #max(table: "runs" | "sessions" | "blocks" | "events"): number {
    const row = this.#db.prepare(`SELECT max(id) AS id FROM ${table}`).get();
    return (row as { id: number | null }).id ?? 0;
  }

  #apply(op: WriteOp): void {
    const run = (name: StatementName, ...values: unknown[]): void =>
      void this.#statements[name].run(...values);
    switch (op.op) {
      case "run":
        run(
          "run",
          op.run,
          op.bench,
          op.judgeVersion,
          op.benchFile,
          op.at,
          ...latchValues(op.latch),
        );
        break;
      case "bench-file":
        run("bench-file", op.id, sha256(op.text), op.text);
        break;
      case "manifest":
        run("manifest", op.id, op.manifest.id, JSON.stringify(op.manifest));
        break;
      case "session":
        run("session", op.session, op.run, op.bench, op.kind, op.benchFile, op.at, op.at);
        break;
      case "session-end":
        run("session-end", op.at, op.session);
        break;
      case "event":
        this.#event(op.run, op.event);
        break;
      case "journal":
        this.#journal(op);
        break;
      case "tail":
        run("tail", ...rowValues(op.rows));
        run("seen", op.rows.n, op.rows.t1, op.rows.session);
        break;
      case "block":
        this.#block(op);
        break;
      case "rollup":
        run("rollup", ...rollupValues(op.row));
        break;
      case "channel":
        run("channel", op.id, ...(JSON.parse(op.key) as (string | number)[]));
        break;
      case "gap":
        run("gap", op.bench, op.from_wall_ms, op.to_wall_ms);
        break;
      case "lost":
        run("lost", op.samples, op.run);
        break;
      case "latch":
        run("latch", op.bench, ...latchValues(op.latch));
        break;
      default:
        op satisfies never;
    }
  }

  #journal(op: WriteOp & { op: "journal" }): void {
    const e = op.entry;
    const asked = [e.request, e.asker, e.requestId, e.value, e.fact, e.factValue];
    const { run, benchFile, manifest } = op;
    this.#statements.journal.run(run, e.input, e.kind, e.now_ms, ...asked, benchFile, manifest);
  }

  /** A packed block, its minutes and hours, and the end of its tail, in the same transaction. */
  #block(op: WriteOp & { op: "block" }): void {
    const { block, minute, hour, tailDone, seen } = this.#statements;
    block.run(...rowValues(op.rows));
    for (const m of op.minutes) {
      minute.run(...statsValues(m, "minute"));
      hour.run(...statsValues(m, "hour"));
    }
    tailDone.run(op.rows.block);
    seen.run(op.unseen, op.rows.t1, op.rows.session);
  }

  /** An event is never dropped for its number: where that is taken, it gets the next free one. */
  #event(run: number, event: BenchEvent): void {
    const { bench, input, tick, mono, wall, kind, hazard } = event;
    const rest = [run, bench, input, tick, mono, wall, kind, hazard, JSON.stringify(event.data)];
    try {
      this.#statements.event.run(event.id, ...rest);
    } catch (error) {
      if (errorCode(error) !== "SQLITE_CONSTRAINT_PRIMARYKEY") throw error;
      this.#statements.event.run(this.#max("events") + 1, ...rest);
    }
  }
}

/** A channel as `channels` tells it apart: bench, name, unit and scale, as JSON. */
type ChannelKey = string;
type ChannelRow = [id: number, bench: string, name: string, unit: string, perCount: number];

interface FileRow {
  readonly id: number;
  readonly text: string;
}

function latchValues(latch: StoredLatch | null): (number | string | null)[] {
  if (latch === null) return [null, null, null, null];
  return [latch.cause, latch.wall, latch.serial, latch.lit ? 1 : 0];
}

const rowValues = (r: StoredRows): unknown[] => [
  ...[r.block, r.session, r.run, r.t0, r.t1, r.input0, r.input1, r.n, r.manifest, r.benchFile],
  ...[r.coded.codec, r.coded.crc, r.coded.blob],
];

function idOf(known: Map<string, number>, text: string, isNew: (id: number) => void): number {
  const found = known.get(text);
  if (found !== undefined) return found;
  const id = Math.max(0, ...known.values()) + 1;
  known.set(text, id);
  isNew(id);
  return id;
}

/** Hash by which a bench file is named: SHA-256 of its text, in hex. */
export const sha256 = (text: string): string => createHash("sha256").update(text).digest("hex");
