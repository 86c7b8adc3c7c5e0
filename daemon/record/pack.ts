import { existsSync, renameSync, rmSync, statSync } from "node:fs";
import Database from "better-sqlite3";
import { RecordProblem } from "./problem.ts";
import { repairTail } from "./repair.ts";
import { migrate } from "./schema.ts";
import {
  inserter,
  type Part,
  pagesOf,
  partsOf,
  placeOfSession,
  RowHash,
  type SessionPlace,
} from "./session-rows.ts";
import type { Work } from "./work.ts";

/** Counts up when an older program could no longer read a pack. */
export const PACK_FORMAT = 1;

/** What a pack says of itself. */
export interface PackFacts {
  readonly format: number;
  readonly bench: string;
  readonly session: number;
  readonly made_wall_ms: number;
}

/** One part's rows in a pack, and the hash over them. */
export interface PackHash {
  readonly part: string;
  readonly rows: number;
  readonly sha256: string;
}

const TABLES = `
  CREATE TABLE pack (
    format INTEGER NOT NULL, bench TEXT NOT NULL, session INTEGER NOT NULL,
    made_wall_ms REAL NOT NULL
  );
  CREATE TABLE pack_hashes (
    part TEXT PRIMARY KEY, rows INTEGER NOT NULL, sha256 TEXT NOT NULL
  ) WITHOUT ROWID;
`;

/** Large enough for a block of a minute in one piece; a pack is read far more often than written. */
const PAGE_BYTES = 4096;

/**
 * Writes one session into one portable file: a record of its own with that session alone, hashes
 * beside it. Samples are copied as they lie, byte by byte. The file appears under its name only
 * when it is whole; one that is there already is left alone. Throws a RecordProblem.
 */
export function* makePack(
  from: Database.Database,
  session: number,
  file: string,
  made_wall_ms: number,
): Work<PackFacts> {
  const place = placeOfSession(from, session);
  if (place === null) {
    throw new RecordProblem(
      `There is no session ${session} in this record.`,
      "Sessions are counted from 1.",
      "See beamsitter sessions for their numbers.",
    );
  }
  refuseExisting(file);
  const part = `${file}.part`;
  rmSync(part, { force: true });
  let db: Database.Database | null = null;
  try {
    db = new Database(part);
    yield* fill(from, db, place, made_wall_ms);
    db.close();
    renameSync(part, file);
    return { format: PACK_FORMAT, bench: place.bench, session, made_wall_ms };
  } finally {
    if (db?.open === true) db.close();
    rmSync(part, { force: true });
    rmSync(`${part}-journal`, { force: true });
  }
}

function refuseExisting(file: string): void {
  if (!existsSync(file)) return;
  throw new RecordProblem(
    `${file} is there already.`,
    `It has ${statSync(file).size} bytes.`,
    "Name another file, or move that one away. Nothing was changed.",
  );
}

function* fill(
  from: Database.Database,
  db: Database.Database,
  place: SessionPlace,
  made_wall_ms: number,
): Work<void> {
  db.pragma(`page_size = ${PAGE_BYTES}`);
  db.pragma("journal_mode = MEMORY");
  migrate(db);
  db.exec(TABLES);
  db.exec("BEGIN");
  const parts = partsOf(from);
  const count = { done: 0, total: totalRows(from, parts, place) };
  for (const part of parts) yield* copyPart(from, db, part, place, count);
  db.exec("COMMIT");
  // A session that goes on is packed as far as it has come.
  repairTail(db);
  yield* writeHashes(db, place);
  db.prepare("INSERT INTO pack VALUES (?,?,?,?)").run(
    ...[PACK_FORMAT, place.bench, place.session, made_wall_ms],
  );
}

function totalRows(db: Database.Database, parts: readonly Part[], place: SessionPlace): number {
  return parts.reduce((sum, { table, where }) => {
    const n = db.prepare(`SELECT count(*) FROM ${table} WHERE ${where}`).pluck().get(place);
    return sum + Number(n);
  }, 0);
}

function* copyPart(
  from: Database.Database,
  to: Database.Database,
  part: Part,
  place: SessionPlace,
  count: { done: number; total: number },
): Work<void> {
  let insert: Database.Statement | null = null;
  for (const rows of pagesOf(from, part, place)) {
    for (const row of rows) {
      insert ??= inserter(to, part.table, row);
      insert.run(row);
    }
    count.done += rows.length;
    yield count;
  }
}

function* writeHashes(db: Database.Database, place: SessionPlace): Work<void> {
  const insert = db.prepare("INSERT INTO pack_hashes VALUES (?,?,?)");
  const parts = partsOf(db);
  for (const [i, part] of parts.entries()) {
    const hash = hashOf(db, part, place);
    insert.run(part.table, hash.rows, hash.hex());
    yield { done: i + 1, total: parts.length };
  }
}

function hashOf(db: Database.Database, part: Part, place: SessionPlace): RowHash {
  const hash = new RowHash();
  for (const rows of pagesOf(db, part, place)) for (const row of rows) hash.add(row);
  return hash;
}

/** What a file says of itself, or null where it is a record but no pack. */
export function packFacts(db: Database.Database): PackFacts | null {
  const has = db.prepare("SELECT 1 FROM sqlite_schema WHERE name = 'pack'").get();
  if (has === undefined) return null;
  return db.prepare("SELECT * FROM pack").get() as PackFacts;
}

/** Compares a pack with the hashes in it; each part that differs is one sentence of the answer. */
export function* checkPack(db: Database.Database, place: SessionPlace): Work<string[]> {
  const stored = db.prepare("SELECT * FROM pack_hashes").all() as PackHash[];
  const parts = new Map(partsOf(db).map((part) => [part.table, part]));
  const faults: string[] = [];
  for (const [i, { part, rows, sha256 }] of stored.entries()) {
    const known = parts.get(part);
    if (known === undefined) faults.push(`its part ${part} is not known here`);
    else {
      const found = hashOf(db, known, place);
      if (found.rows !== rows) faults.push(`${part} has ${found.rows} rows, ${rows} were packed`);
      else if (found.hex() !== sha256) faults.push(`${part} does not match its hash`);
    }
    yield { done: i + 1, total: stored.length };
  }
  return faults;
}
