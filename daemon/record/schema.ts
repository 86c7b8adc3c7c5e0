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
  // Version 2. Rollups of a minute and an hour are in the controller's counts, like the blocks, so
  // that a better calibration re-reads them; the views minutes and hours give them in the
  // manifest's units, with the standard deviation, for any SQLite tool. Their t is civil time.
  `
  CREATE TABLE rollups (
    id INTEGER PRIMARY KEY, step_s INTEGER NOT NULL, block0 INTEGER NOT NULL,
    block1 INTEGER NOT NULL, session INTEGER NOT NULL REFERENCES sessions(id),
    run INTEGER NOT NULL REFERENCES runs(id), manifest INTEGER NOT NULL REFERENCES manifests(id),
    t0 REAL NOT NULL, t1 REAL NOT NULL, n INTEGER NOT NULL,
    codec INTEGER NOT NULL, crc INTEGER NOT NULL, blob BLOB NOT NULL, UNIQUE (step_s, block0)
  );
  CREATE INDEX rollups_t0 ON rollups(step_s, t0);
  -- 1 where the rollups have the block.
  ALTER TABLE blocks ADD COLUMN rolled INTEGER NOT NULL DEFAULT 0;
  CREATE INDEX blocks_unrolled ON blocks(t0) WHERE rolled = 0;
  CREATE TABLE channels (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, name TEXT NOT NULL, unit TEXT NOT NULL,
    per_count REAL NOT NULL, UNIQUE (bench, name, unit, per_count)
  );
  CREATE TABLE rollup_1min (
    channel INTEGER NOT NULL REFERENCES channels(id), minute INTEGER NOT NULL, n INTEGER NOT NULL,
    min INTEGER NOT NULL, mean REAL NOT NULL, max INTEGER NOT NULL, m2 REAL NOT NULL,
    PRIMARY KEY (channel, minute)
  ) WITHOUT ROWID;
  CREATE TABLE rollup_1h (
    channel INTEGER NOT NULL REFERENCES channels(id), hour INTEGER NOT NULL, n INTEGER NOT NULL,
    min INTEGER NOT NULL, mean REAL NOT NULL, max INTEGER NOT NULL, m2 REAL NOT NULL,
    PRIMARY KEY (channel, hour)
  ) WITHOUT ROWID;
  CREATE VIEW minutes AS
    SELECT c.bench, c.name, c.unit, r.minute * 60000 AS wall_ms,
      datetime(r.minute * 60, 'unixepoch') AS utc, r.n, min(r.min * c.per_count, r.max * c.per_count)
      AS min, r.mean * c.per_count AS mean, max(r.min * c.per_count, r.max * c.per_count) AS max,
      sqrt(max(0, r.m2) / r.n) * abs(c.per_count) AS standard_deviation
    FROM rollup_1min r JOIN channels c ON c.id = r.channel;
  CREATE VIEW hours AS
    SELECT c.bench, c.name, c.unit, r.hour * 3600000 AS wall_ms,
      datetime(r.hour * 3600, 'unixepoch') AS utc, r.n, min(r.min * c.per_count, r.max * c.per_count)
      AS min, r.mean * c.per_count AS mean, max(r.min * c.per_count, r.max * c.per_count) AS max,
      sqrt(max(0, r.m2) / r.n) * abs(c.per_count) AS standard_deviation
    FROM rollup_1h r JOIN channels c ON c.id = r.channel;
  CREATE TABLE notes (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, wall_ms REAL NOT NULL, session INTEGER,
    who TEXT NOT NULL, text TEXT NOT NULL, picture BLOB, picture_type TEXT
  );
  CREATE INDEX notes_wall ON notes(wall_ms);
  CREATE TABLE tags (
    session INTEGER NOT NULL REFERENCES sessions(id), tag TEXT NOT NULL,
    PRIMARY KEY (session, tag)
  ) WITHOUT ROWID;
  CREATE INDEX epochs_part ON epochs(bench, part, wall_ms);
  -- What has been carried elsewhere ("influx", "pack", "csv" ...): retention looks here.
  CREATE TABLE exported (
    bench TEXT NOT NULL, target TEXT NOT NULL, from_wall_ms REAL NOT NULL,
    to_wall_ms REAL NOT NULL, at_wall_ms REAL NOT NULL,
    PRIMARY KEY (bench, target, from_wall_ms)
  ) WITHOUT ROWID;
  -- Stretches whose full rate stays for ever: black boxes, sweeps, what a person marked.
  CREATE TABLE kept (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, from_wall_ms REAL NOT NULL,
    to_wall_ms REAL NOT NULL, why TEXT NOT NULL
  );
  -- What retention took away: the row of the block stays, with codec 255 and no bytes.
  CREATE TABLE retired (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, at_wall_ms REAL NOT NULL,
    from_wall_ms REAL NOT NULL, to_wall_ms REAL NOT NULL, blocks INTEGER NOT NULL,
    samples INTEGER NOT NULL, bytes INTEGER NOT NULL, rule TEXT NOT NULL
  );
  `,
  // Version 3: what a second, independent instrument read, or a person typed. Value in `unit`.
  `
  CREATE TABLE readings (
    id INTEGER PRIMARY KEY, bench TEXT NOT NULL, name TEXT NOT NULL, wall_ms REAL NOT NULL,
    value REAL NOT NULL, unit TEXT NOT NULL, typed INTEGER NOT NULL, who TEXT NOT NULL,
    note TEXT NOT NULL
  );
  CREATE INDEX readings_at ON readings(bench, name, wall_ms);
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

/**
 * Gives a file of an older version, opened for reading only, the tables and views that it lacks, as
 * empty ones in memory: whoever reads need not ask which version it is. The file is not touched.
 */
export function standInForMissing(db: Database.Database): void {
  const version = pragma(db, "user_version");
  if (version >= SCHEMA_VERSION) return;
  db.pragma("temp_store = MEMORY");
  for (const step of MIGRATIONS.slice(version)) {
    for (const statement of step.split(";")) {
      const made = statement.replace(/CREATE (TABLE|VIEW) /, "CREATE TEMP $1 ");
      if (made !== statement) db.exec(made);
    }
  }
  if (version < 2) db.exec("CREATE TEMP VIEW blocks AS SELECT *, 0 AS rolled FROM main.blocks");
}
