import {
  closeSync,
  mkdirSync,
  openSync,
  readFileSync,
  readSync,
  statSync,
  writeFileSync,
} from "node:fs";
import { join } from "node:path";
import Database from "better-sqlite3";
import { errorCode, problemOf, RecordProblem } from "./problem.ts";
import { checkIfUsed, checkVersion, migrate, standInForMissing } from "./schema.ts";

/** The one file of a data folder that holds everything recorded. */
export const recordFile = (folder: string): string => join(folder, "record.sqlite");

/** Exclusive use of a data folder, until released or until the process ends, however it ends. */
export interface FolderLock {
  release(): void;
}

const SQLITE_HEADER = "SQLite format 3\0";

/** Small pages: the last one of a row is half empty, and that is most of what a record wastes. */
const PAGE_BYTES = 2048;

/**
 * Takes the folder for this process alone, making it where it is missing. The lock is the system's
 * own on `record.lock`, so one left by a killed daemon is no lock at all; `record.holder` names who
 * has it, for people. Throws a RecordProblem that names the holder where somebody else has it.
 */
export function lockFolder(folder: string): FolderLock {
  makeFolder(folder);
  let db: Database.Database | null = null;
  try {
    db = new Database(join(folder, "record.lock"), { timeout: 0 });
    db.pragma("locking_mode = EXCLUSIVE");
    db.exec("BEGIN EXCLUSIVE");
    writeFileSync(join(folder, "record.holder"), `${process.pid}\n`);
  } catch (error) {
    db?.close();
    const code = errorCode(error);
    if (code !== "SQLITE_BUSY" && code !== "SQLITE_LOCKED") throw problemOf(error, folder);
    throw new RecordProblem(
      `The data folder ${folder} is in use.`,
      `The process ${holderOf(folder)} has it.`,
      "Stop that daemon first, or name another folder with --data. Nothing was changed.",
    );
  }
  const held = db;
  return { release: () => void held.close() };
}

function holderOf(folder: string): string {
  try {
    return readFileSync(join(folder, "record.holder"), "utf8").trim();
  } catch (error) {
    return `(not known: ${errorCode(error)})`;
  }
}

function makeFolder(folder: string): void {
  try {
    mkdirSync(folder, { recursive: true, mode: 0o700 });
  } catch (error) {
    if (errorCode(error) !== "EEXIST" && errorCode(error) !== "ENOTDIR") {
      throw problemOf(error, folder);
    }
    throw new RecordProblem(
      `${folder} is no folder.`,
      "A data folder is wanted; a file has that name, or one above it.",
      "Name a folder with --data; it is made where it is missing.",
    );
  }
}

/** Opens the record for writing, making or migrating it. The caller holds the folder's lock. */
export function openForWriting(
  folder: string,
  durability: "power-cut" | "none",
): Database.Database {
  refuseJunk(recordFile(folder));
  let db: Database.Database | null = null;
  try {
    db = new Database(recordFile(folder), { timeout: 2000 });
    // Before anything is changed: the file may be somebody else's.
    checkIfUsed(db, recordFile(folder));
    db.pragma(`page_size = ${PAGE_BYTES}`);
    db.pragma("journal_mode = WAL");
    // FULL also syncs the log at each commit: what was committed outlives a power cut.
    db.pragma(`synchronous = ${durability === "power-cut" ? "FULL" : "OFF"}`);
    migrate(db);
    return db;
  } catch (error) {
    db?.close();
    throw problemOf(error, folder);
  }
}

/**
 * Closes a record that was open for writing. Where nobody reads it at this moment it becomes one
 * plain file, which can be copied alone and read from a read-only disk.
 */
export function closeWritten(db: Database.Database): void {
  try {
    db.pragma("busy_timeout = 0");
    db.pragma("journal_mode = DELETE");
  } catch (error) {
    // A reader has it open, or the disk refuses: the log stays beside the file, nothing is lost.
    if (!errorCode(error).startsWith("SQLITE_")) throw error;
  } finally {
    db.close();
  }
}

/** Opens a record, or a pack of one session, for reading only; never makes or changes anything. */
export function openForReading(folder: string): Database.Database {
  const isPack = statSync(folder, { throwIfNoEntry: false })?.isFile() === true;
  const file = isPack ? folder : recordFile(folder);
  if (statSync(file, { throwIfNoEntry: false }) === undefined) {
    throw new RecordProblem(
      `${folder} is no data folder.`,
      "There is no record.sqlite in it.",
      "Name the folder that a daemon or demo recorded into with --data.",
    );
  }
  refuseJunk(file);
  let db: Database.Database | null = null;
  try {
    db = new Database(file, { readonly: true, fileMustExist: true, timeout: 1000 });
    checkVersion(db, file);
    standInForMissing(db);
    return db;
  } catch (error) {
    db?.close();
    if (error instanceof RecordProblem) throw error;
    throw new RecordProblem(
      `The record ${file} cannot be read.`,
      `SQLite says ${errorCode(error)}.`,
      "Where the folder lies on a read-only disk, copy it to a writable one and read the copy.",
    );
  }
}

/** SQLite would open a junk file and fail only later, or take an empty one for its own. */
function refuseJunk(file: string): void {
  const found = statSync(file, { throwIfNoEntry: false });
  if (found === undefined || (found.isFile() && found.size === 0)) return;
  const head = Buffer.alloc(SQLITE_HEADER.length);
  if (found.isFile()) {
    const handle = openSync(file, "r");
    readSync(handle, head, 0, head.length, 0);
    closeSync(handle);
  }
  if (head.toString("latin1") === SQLITE_HEADER) return;
  throw new RecordProblem(
    `${file} is no record of beamsitter.`,
    found.isFile() ? "It does not begin as an SQLite file does." : "It is not a file.",
    "Move it away, or name another data folder with --data. Nothing was changed.",
  );
}
