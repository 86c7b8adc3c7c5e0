import { createHash, type Hash } from "node:crypto";
import type Database from "better-sqlite3";

/** A row of any table, as it lies on the disk. */
export type RawRow = Record<string, number | string | Uint8Array | null>;

/** Where a session stands in its record. */
export interface SessionPlace {
  readonly session: number;
  readonly run: number;
  readonly bench: string;
  readonly from: number;
  readonly to: number;
  /** Last input of the judge that falls into it. */
  readonly input: number;
}

/** Rows of one table that belong to a session, in the order of `key`, which no two of them share. */
export interface Part {
  readonly table: string;
  readonly key: string;
  readonly where: string;
}

const OF_BLOCKS = (column: string): string =>
  `SELECT ${column} FROM blocks WHERE session = @session
   UNION SELECT ${column} FROM tail WHERE session = @session`;
const OF_JOURNAL = "run = @run AND input <= @input";

/**
 * What makes up a session, in an order in which each row only points to earlier ones. Minute and
 * hour rollups are no part of it: they mix sessions, and are made again from the blocks. The latch
 * is none either: a pack that comes back must never clear or set one.
 */
const PARTS: readonly Part[] = [
  {
    table: "bench_files",
    key: "id",
    where: `id IN (${OF_BLOCKS("bench_file")}
      UNION SELECT bench_file FROM sessions WHERE id = @session
      UNION SELECT bench_file FROM runs WHERE id = @run
      UNION SELECT bench_file FROM journal WHERE ${OF_JOURNAL})`,
  },
  {
    table: "manifests",
    key: "id",
    where: `id IN (${OF_BLOCKS("manifest")}
      UNION SELECT manifest FROM journal WHERE ${OF_JOURNAL})`,
  },
  { table: "runs", key: "id", where: "id = @run" },
  { table: "sessions", key: "id", where: "id = @session" },
  { table: "blocks", key: "id", where: "session = @session" },
  { table: "tail", key: "id", where: "session = @session" },
  {
    table: "rollup_1s",
    key: "block",
    where: "block IN (SELECT id FROM blocks WHERE session = @session)",
  },
  { table: "rollups", key: "id", where: "session = @session" },
  {
    table: "events",
    key: "id",
    where: "run = @run AND wall_ms >= @from AND wall_ms <= @to",
  },
  { table: "journal", key: "input", where: OF_JOURNAL },
  {
    table: "gaps",
    key: "id",
    where: "bench = @bench AND to_wall_ms > @from AND from_wall_ms < @to",
  },
  { table: "epochs", key: "id", where: "bench = @bench AND wall_ms <= @to" },
  {
    table: "notes",
    key: "id",
    where: `session = @session
      OR (session IS NULL AND bench = @bench AND wall_ms >= @from AND wall_ms <= @to)`,
  },
  { table: "tags", key: "tag", where: "session = @session" },
  {
    table: "readings",
    key: "id",
    where: "bench = @bench AND wall_ms >= @from AND wall_ms <= @to",
  },
  {
    table: "kept",
    key: "id",
    where: "bench = @bench AND to_wall_ms > @from AND from_wall_ms < @to",
  },
];

/** The parts for which a record has a table. */
export function partsOf(db: Database.Database): Part[] {
  const tables = new Set(
    db.prepare("SELECT name FROM sqlite_schema WHERE type = 'table'").pluck().all(),
  );
  return PARTS.filter((part) => tables.has(part.table));
}

/** The place of a session, or null where there is none of that number. */
export function placeOfSession(db: Database.Database, session: number): SessionPlace | null {
  const row = db
    .prepare(
      `SELECT id AS session, run, bench, started_wall_ms AS "from",
       max(last_wall_ms, ifnull(ended_wall_ms, last_wall_ms)) AS "to",
       ifnull((SELECT max(input1) FROM blocks WHERE session = @session), 0) AS packed,
       ifnull((SELECT max(input1) FROM tail WHERE session = @session), 0) AS growing
       FROM sessions WHERE id = @session`,
    )
    .get({ session }) as (SessionPlace & { packed: number; growing: number }) | undefined;
  if (row === undefined) return null;
  const { packed, growing, ...place } = row;
  return { ...place, input: Math.max(packed, growing) };
}

/** Rows read at once: a page of blocks is a few megabytes at most. */
const PAGE_ROWS = 64;

/** The rows of a part, a page at a time, so that no read transaction outlives a page. */
export function* pagesOf(
  db: Database.Database,
  part: Part,
  place: SessionPlace,
): Generator<RawRow[]> {
  const { table, key, where } = part;
  const read = db.prepare(
    `SELECT * FROM ${table} WHERE (${where}) AND (@after IS NULL OR ${key} > @after)
     ORDER BY ${key} LIMIT ${PAGE_ROWS}`,
  );
  for (let after: RawRow[string] = null; ; ) {
    const rows = read.all({ ...place, after }) as RawRow[];
    if (rows.length > 0) yield rows;
    const last = rows[PAGE_ROWS - 1];
    if (last === undefined) return;
    after = last[key] ?? null;
  }
}

/** A statement that inserts rows of that shape. */
export function inserter(db: Database.Database, table: string, row: RawRow): Database.Statement {
  const columns = Object.keys(row);
  return db.prepare(
    `INSERT INTO ${table} (${columns.join(", ")}) VALUES (${columns.map((c) => `@${c}`).join(", ")})`,
  );
}

/** SHA-256 over rows: each value as JSON, bytes with their length before them. */
export class RowHash {
  rows = 0;
  readonly #hash: Hash = createHash("sha256");

  add(row: RawRow): void {
    this.rows++;
    for (const column of Object.keys(row).sort()) {
      const value = row[column] ?? null;
      if (value instanceof Uint8Array) {
        this.#hash.update(`${column}:${value.length}\n`);
        this.#hash.update(value);
      } else {
        this.#hash.update(`${column}=${JSON.stringify(value)}\n`);
      }
    }
  }

  hex(): string {
    return this.#hash.digest("hex");
  }
}
