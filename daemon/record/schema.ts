import type Database from "better-sqlite3";
import { RecordProblem } from "./problem.ts";

/** Marks an SQLite file as a record of ours ("bstr"). */
export const APPLICATION_ID = 0x62737472;

/**
 * One entry a version, applied in order and never changed once released: a file of version n gets
 * the entries from n on. Wall times are milliseconds since 1970 UTC; columns of integers that are
 * scaled say so in BLOCKS.md. `runs` is one life of a daemon: the judge starts fresh with each, so
 * a replay begins there. `tail` holds the chunks of the block that is still growing.
 */
export const MIGRATIONS: readonly string[] = [
  `
  CREATE TABLE bench_files (
    id INTEGER PRIMARY KEY, hash TEXT NOT NULL UNIQUE, text TEXT NOT NULL
  );
  CREATE TABLE manifests (
    id INTEGER PRIMARY KEY, crc TEXT NOT NULL, json TEXT NOT NULL UNIQUE
  );
  CREATE TABLE runs (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, judge_version INTEGER NOT NULL,
    bench_file INTEGER NOT NULL REFERENCES bench_files(id), started_wall_ms REAL NOT NULL,
    latch_cause INTEGER, latch_wall_ms REAL, latch_serial TEXT, latch_lit INTEGER,
    lost_samples INTEGER NOT NULL DEFAULT 0
  );
  CREATE TABLE sessions (
    id INTEGER PRIMARY KEY, run INTEGER NOT NULL REFERENCES runs(id), bench TEXT NOT NULL,
    kind TEXT NOT NULL, bench_file INTEGER NOT NULL REFERENCES bench_files(id),
    started_wall_ms REAL NOT NULL, last_wall_ms REAL NOT NULL, ended_wall_ms REAL,
    samples INTEGER NOT NULL DEFAULT 0
  );
  CREATE INDEX sessions_started ON sessions(started_wall_ms);
  CREATE TABLE epochs (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, part TEXT NOT NULL, wall_ms REAL NOT NULL,
    words TEXT NOT NULL
  );
  CREATE TABLE events (
    id INTEGER PRIMARY KEY, run INTEGER NOT NULL REFERENCES runs(id), bench TEXT NOT NULL,
    input INTEGER NOT NULL, tick INTEGER NOT NULL, mono_ms REAL NOT NULL, wall_ms REAL NOT NULL,
    kind TEXT NOT NULL, hazard TEXT NOT NULL, data TEXT NOT NULL
  );
  CREATE INDEX events_wall ON events(wall_ms);
  CREATE TABLE journal (
    run INTEGER NOT NULL REFERENCES runs(id), input INTEGER NOT NULL, kind INTEGER NOT NULL,
    now_ms REAL NOT NULL, request INTEGER NOT NULL, asker INTEGER NOT NULL,
    request_id INTEGER NOT NULL, value REAL NOT NULL, fact INTEGER NOT NULL,
    fact_value REAL NOT NULL, bench_file INTEGER NOT NULL, manifest INTEGER,
    PRIMARY KEY (run, input)
  ) WITHOUT ROWID;
  CREATE TABLE blocks (
    id INTEGER PRIMARY KEY, session INTEGER NOT NULL REFERENCES sessions(id),
    run INTEGER NOT NULL REFERENCES runs(id), t0 REAL NOT NULL, t1 REAL NOT NULL,
    input0 INTEGER NOT NULL, input1 INTEGER NOT NULL, n INTEGER NOT NULL,
    manifest INTEGER NOT NULL REFERENCES manifests(id),
    bench_file INTEGER NOT NULL REFERENCES bench_files(id),
    codec INTEGER NOT NULL, crc INTEGER NOT NULL, blob BLOB NOT NULL
  );
  CREATE INDEX blocks_t0 ON blocks(t0);
  CREATE INDEX blocks_input ON blocks(run, input0);
  CREATE INDEX blocks_session ON blocks(session);
  CREATE TABLE tail (
    id INTEGER PRIMARY KEY, block INTEGER NOT NULL, session INTEGER NOT NULL,
    run INTEGER NOT NULL, t0 REAL NOT NULL, t1 REAL NOT NULL,
    input0 INTEGER NOT NULL, input1 INTEGER NOT NULL, n INTEGER NOT NULL,
    manifest INTEGER NOT NULL, bench_file INTEGER NOT NULL,
    codec INTEGER NOT NULL, crc INTEGER NOT NULL, blob BLOB NOT NULL
  );
  CREATE TABLE rollup_1s (
    block INTEGER PRIMARY KEY REFERENCES blocks(id),
    codec INTEGER NOT NULL, crc INTEGER NOT NULL, blob BLOB NOT NULL
  );
  CREATE TABLE gaps (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, from_wall_ms REAL NOT NULL,
    to_wall_ms REAL NOT NULL
  );
  CREATE INDEX gaps_to ON gaps(to_wall_ms);
  CREATE TABLE latch (
    bench TEXT PRIMARY KEY, cause INTEGER NOT NULL, wall_ms REAL NOT NULL, serial TEXT NOT NULL,
    lit INTEGER NOT NULL
  ) WITHOUT ROWID;
  `,
];

/** Version that this program writes. */
export const SCHEMA_VERSION = MIGRATIONS.length;

const pragma = (db: Database.Database, name: string): number =>
  Number(db.pragma(name, { simple: true }));

/** Refuses a file that is another program's or from a newer version of this one. */
export function checkVersion(db: Database.Database, file: string): void {
  const version = pragma(db, "user_version");
  const application = pragma(db, "application_id");
  if (application !== APPLICATION_ID) {
    throw new RecordProblem(
      `${file} is no record of beamsitter.`,
      "It is an SQLite file of another program.",
      "Name another data folder with --data. Nothing was changed.",
    );
  }
  if (version > SCHEMA_VERSION) {
    throw new RecordProblem(
      `${file} was written by a newer beamsitter.`,
      `Its version is ${version}; this program knows versions up to ${SCHEMA_VERSION}.`,
      "Update beamsitter, or name another data folder with --data. Nothing was changed.",
    );
  }
}

/** `checkVersion`, for a file that may also be new and empty. */
export function checkIfUsed(db: Database.Database, file: string): void {
  const tables = db.prepare("SELECT count(*) FROM sqlite_schema").pluck().get();
  if (tables !== 0) checkVersion(db, file);
}

/** Brings a file up to this program's version, each step whole or not at all. */
export function migrate(db: Database.Database): void {
  for (let version = pragma(db, "user_version"); version < SCHEMA_VERSION; version++) {
    const step = MIGRATIONS[version] ?? "";
    db.transaction(() => {
      db.exec(step);
      db.pragma(`application_id = ${APPLICATION_ID}`);
      db.pragma(`user_version = ${version + 1}`);
    }).immediate();
  }
}
