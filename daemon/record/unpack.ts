import { copyFileSync, rmSync } from "node:fs";
import Database from "better-sqlite3";
import type { Manifest } from "../model/manifest.ts";
import { checkPack, PACK_FORMAT, type PackFacts, packFacts } from "./pack.ts";
import { errorCode, errorText, RecordProblem } from "./problem.ts";
import { checkVersion, migrate, SCHEMA_VERSION } from "./schema.ts";
import {
  inserter,
  type Part,
  pagesOf,
  partsOf,
  placeOfSession,
  type RawRow,
  type SessionPlace,
} from "./session-rows.ts";
import type { Store, WriteOp } from "./store.ts";
import type { Work } from "./work.ts";

/** Kind of a session whose rows are still arriving; one found at start is taken away again. */
const ARRIVING = "arriving";

/** Parts that come through the store, which counts their numbers. */
const BY_STORE = new Set(["bench_files", "manifests", "runs", "sessions"]);

/**
 * Parts that belong to a bench and not to one session: they come last, in one write, and only where
 * the record does not have the same already.
 */
const OF_BENCH = new Set(["gaps", "epochs", "kept", "readings"]);

/** A pack, open, and where its session stands in it. */
interface OpenPack {
  readonly db: Database.Database;
  readonly facts: PackFacts;
  readonly place: SessionPlace;
}

/** Numbers of the pack and what they are in the record. */
interface Numbers {
  readonly run: number;
  readonly session: number;
  readonly benchFiles: Map<number, number>;
  readonly manifests: Map<number, number>;
  readonly blocks: Map<number, number>;
  /** Added to the numbers of events. */
  readonly events: number;
}

/**
 * Brings a packed session into a record: its hashes are checked first, its rows get numbers of their
 * own here, and its samples stay as they are, byte by byte. Returns the session's number. Whatever
 * ends it early, nothing of it stays. Throws a RecordProblem.
 * @param scratch a file name in a folder where this user may write, for a pack of an older version
 */
export function* unpack(store: Store, file: string, scratch: string): Work<number> {
  const pack = openPack(file);
  let from: Database.Database = pack.db;
  try {
    const faults = yield* checkPack(pack.db, pack.place);
    if (faults.length > 0) throw damaged(file, faults);
    refuseTwice(store, pack, file);
    if (Number(from.pragma("user_version", { simple: true })) < SCHEMA_VERSION) {
      from = migratedCopy(file, scratch);
    }
    return yield* bring(store, from, pack.place);
  } finally {
    if (from !== pack.db) from.close();
    pack.db.close();
    rmSync(scratch, { force: true });
  }
}

/** Opens a pack for reading and checks that it is one. */
function openPack(file: string): OpenPack {
  let db: Database.Database | null = null;
  try {
    db = new Database(file, { readonly: true, fileMustExist: true });
    checkVersion(db, file);
    const facts = packFacts(db);
    if (facts === null) throw noPack(file, "It is a record, but no pack.");
    if (facts.format > PACK_FORMAT) {
      throw noPack(file, `Its format is ${facts.format}; ${PACK_FORMAT} is the newest known here.`);
    }
    const place = placeOfSession(db, facts.session);
    if (place === null) throw noPack(file, "Its session is missing.");
    return { db, facts, place };
  } catch (error) {
    db?.close();
    if (error instanceof RecordProblem) throw error;
    throw noPack(file, `SQLite says ${errorCode(error) || errorText(error)}.`);
  }
}

const noPack = (file: string, found: string): RecordProblem =>
  new RecordProblem(
    `${file} is no pack that can be read here.`,
    found,
    "Name a file that beamsitter sessions pack wrote. Nothing was changed.",
  );

const damaged = (file: string, faults: readonly string[]): RecordProblem =>
  new RecordProblem(
    `The pack ${file} is damaged.`,
    `${faults.join("; ")}.`,
    "Copy it again from where it came. It can still be read as it is: name it with --data.",
  );

function refuseTwice(store: Store, { db, place }: OpenPack, file: string): void {
  const packed = db
    .prepare("SELECT started_wall_ms AS started, samples FROM sessions WHERE id = ?")
    .get(place.session) as { started: number; samples: number };
  const here = store.within((record) =>
    record
      .prepare(
        `SELECT id FROM sessions WHERE bench = ? AND started_wall_ms = ? AND samples = ?
         AND kind <> '${ARRIVING}'`,
      )
      .pluck()
      .get(place.bench, packed.started, packed.samples),
  );
  if (here === undefined) return;
  throw new RecordProblem(
    `The session in ${file} is here already.`,
    `It is session ${String(here)}.`,
    "Nothing was changed.",
  );
}

function migratedCopy(file: string, scratch: string): Database.Database {
  copyFileSync(file, scratch);
  const db = new Database(scratch);
  migrate(db);
  return db;
}

function* bring(store: Store, from: Database.Database, place: SessionPlace): Work<number> {
  const numbers = begin(store, from, place);
  let isWhole = false;
  try {
    const parts = partsOf(from).filter(({ table }) => !BY_STORE.has(table) && !OF_BENCH.has(table));
    const total = parts.reduce((sum, part) => sum + countOf(from, part, place), 0);
    let done = 0;
    for (const part of parts) {
      for (const rows of pagesOf(from, part, place)) {
        store.within((record) => {
          let insert: Database.Statement | null = null;
          for (const row of rows) {
            const renumbered = renumber(store, part.table, row, numbers);
            insert ??= inserter(record, part.table, renumbered);
            insert.run(renumbered);
          }
        });
        done += rows.length;
        yield { done, total };
      }
    }
    finish(store, from, place, numbers);
    isWhole = true;
    return numbers.session;
  } finally {
    if (!isWhole) store.within((record) => removeRun(record, numbers.run));
  }
}

const countOf = (db: Database.Database, { table, where }: Part, place: SessionPlace): number =>
  Number(db.prepare(`SELECT count(*) FROM ${table} WHERE ${where}`).pluck().get(place));

/** Bench files, manifests, the run, and the session as one that is arriving. */
function begin(store: Store, from: Database.Database, place: SessionPlace): Numbers {
  const ops: WriteOp[] = [];
  const all = (sql: string): RawRow[] => from.prepare(sql).all() as RawRow[];
  const benchFiles = new Map(
    all("SELECT id, text FROM bench_files").map((row) => [
      Number(row.id),
      store.benchFileId(String(row.text), ops),
    ]),
  );
  const manifests = new Map(
    all("SELECT id, json FROM manifests").map((row) => [
      Number(row.id),
      store.manifestId(JSON.parse(String(row.json)) as Manifest, ops),
    ]),
  );
  store.write(ops);
  const numbers: Numbers = {
    run: store.nextRun(),
    session: store.nextSession(),
    benchFiles,
    manifests,
    blocks: new Map(),
    events: eventsOffset(store, from),
  };
  store.within((record) => {
    for (const table of ["runs", "sessions"]) {
      const id = table === "runs" ? place.run : place.session;
      const row = from.prepare(`SELECT * FROM ${table} WHERE id = ?`).get(id) as RawRow;
      const renumbered = renumber(store, table, row, numbers);
      if (table === "sessions") renumbered.kind = ARRIVING;
      inserter(record, table, renumbered).run(renumbered);
    }
  });
  return numbers;
}

/**
 * Events keep their numbers where all of those are free and a daemon will not come to them; else
 * they get numbers below zero, ascending in time like all others.
 */
function eventsOffset(store: Store, from: Database.Database): number {
  const packed = bounds(from);
  const here = store.within(bounds);
  if (packed.max === null || packed.min === null || here.max === null) return 0;
  const taken = store.within((record) =>
    record
      .prepare("SELECT 1 FROM events WHERE id >= ? AND id <= ? LIMIT 1")
      .get(packed.min, packed.max),
  );
  if (taken === undefined && packed.max < here.max) return 0;
  return Math.min(0, here.min ?? 0) - 1 - packed.max;
}

const bounds = (db: Database.Database): { min: number | null; max: number | null } =>
  db.prepare("SELECT min(id) AS min, max(id) AS max FROM events").get() as {
    min: number | null;
    max: number | null;
  };

/** The same row with the record's numbers. Rows that only have a number of their own get a new one. */
function renumber(store: Store, table: string, row: RawRow, numbers: Numbers): RawRow {
  const made: RawRow = { ...row };
  if (table === "runs") made.id = numbers.run;
  else if (table === "sessions") made.id = numbers.session;
  else if (table === "events") made.id = Number(row.id) + numbers.events;
  else if (table === "blocks") made.id = blockNumber(store, Number(row.id), numbers);
  else if ("id" in row) made.id = null;
  if ("run" in row) made.run = numbers.run;
  if ("session" in row && row.session !== null) made.session = numbers.session;
  for (const column of ["block", "block0", "block1"]) {
    if (column in row) made[column] = numbers.blocks.get(Number(row[column])) ?? 0;
  }
  if ("bench_file" in row) made.bench_file = numbers.benchFiles.get(Number(row.bench_file)) ?? 0;
  if ("manifest" in row && row.manifest !== null) {
    made.manifest = numbers.manifests.get(Number(row.manifest)) ?? 0;
  }
  return made;
}

function blockNumber(store: Store, packed: number, numbers: Numbers): number {
  const id = store.nextBlock();
  numbers.blocks.set(packed, id);
  return id;
}

/** The session is shown from here on, with what its bench's record says about its time. */
function finish(
  store: Store,
  from: Database.Database,
  place: SessionPlace,
  numbers: Numbers,
): void {
  const kind = from.prepare("SELECT kind FROM sessions WHERE id = ?").pluck().get(place.session);
  const shared = partsOf(from).filter(({ table }) => OF_BENCH.has(table));
  store.within((record) => {
    for (const part of shared) {
      for (const row of [...pagesOf(from, part, place)].flat()) addUnlessThere(record, part, row);
    }
    record.prepare("UPDATE sessions SET kind = ? WHERE id = ?").run(kind, numbers.session);
    store.rollMinutes(numbers.session);
  });
}

function addUnlessThere(record: Database.Database, { table }: Part, packed: RawRow): void {
  const { id: _id, ...row } = packed;
  const same = Object.keys(row).map((column) => `${column} IS @${column}`);
  const found = record.prepare(`SELECT 1 FROM ${table} WHERE ${same.join(" AND ")}`).get(row);
  if (found === undefined) inserter(record, table, row).run(row);
}

/** Takes away what a daemon that was killed meanwhile had brought in so far. */
export function sweepArriving(store: Store): void {
  store.within((record) => {
    const runs = record
      .prepare(`SELECT run FROM sessions WHERE kind = '${ARRIVING}'`)
      .pluck()
      .all();
    for (const run of runs) removeRun(record, Number(run));
  });
}

/** All rows of a run that came out of a pack; such a run has one session and nothing else has it. */
function removeRun(record: Database.Database, run: number): void {
  const tables = new Set(partsOf(record).map((part) => part.table));
  const remove = (table: string, where: string): void => {
    if (tables.has(table)) record.prepare(`DELETE FROM ${table} WHERE ${where}`).run({ run });
  };
  const blocks = "SELECT id FROM blocks WHERE run = @run";
  const sessions = "SELECT id FROM sessions WHERE run = @run";
  remove("rollup_1s", `block IN (${blocks})`);
  remove("rollups", "run = @run");
  remove("blocks", "run = @run");
  remove("events", "run = @run");
  remove("journal", "run = @run");
  remove("notes", `session IN (${sessions})`);
  remove("tags", `session IN (${sessions})`);
  remove("sessions", "run = @run");
  remove("runs", "id = @run");
}
