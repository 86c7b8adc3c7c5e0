import type Database from "better-sqlite3";
import { RecordProblem } from "./problem.ts";
import type { Store } from "./store.ts";

/** Longest text of a note, and largest picture: a note is read beside the time axis. */
export const NOTE_CHARS_MAX = 4000;
export const PICTURE_BYTES_MAX = 1024 * 1024;
const TAG = /^[\p{L}\p{N}][\p{L}\p{N} ._-]{0,39}$/u;

/** A note as it is given. A note of a session may stand anywhere on the time axis. */
export interface NewNote {
  readonly bench: string;
  readonly wall_ms: number;
  readonly session: number | null;
  readonly who: string;
  readonly text: string;
  readonly picture: Uint8Array | null;
}

/** A note as it is kept, without its picture's bytes. */
export interface NoteRow {
  readonly id: number;
  readonly bench: string;
  readonly at: number;
  readonly session: number | null;
  readonly who: string;
  readonly text: string;
  readonly pictureType: string | null;
  readonly pictureBytes: number;
}

/** Keeps a note; returns its number. Throws a RecordProblem that says what is wrong with it. */
export function writeNote(store: Store, note: NewNote): number {
  const text = note.text.trim();
  if (text === "" || text.length > NOTE_CHARS_MAX) {
    throw refused(`A note has 1 to ${NOTE_CHARS_MAX} characters.`, `This one has ${text.length}.`);
  }
  const type = note.picture === null ? null : pictureType(note.picture);
  if (note.session !== null) wantSession(store, note.session);
  return store.within((db) => {
    const made = db
      .prepare(
        `INSERT INTO notes (bench, wall_ms, session, who, text, picture, picture_type)
         VALUES (?,?,?,?,?,?,?)`,
      )
      .run(note.bench, note.wall_ms, note.session, note.who, text, note.picture, type);
    return Number(made.lastInsertRowid);
  });
}

/** Sets or takes away a tag of a session; false where that changed nothing. */
export function writeTag(
  store: Store,
  session: number,
  tag: string,
  does: "set" | "remove",
): boolean {
  const text = tag.trim();
  if (!TAG.test(text)) {
    throw refused(
      "A tag has 1 to 40 letters, digits, spaces, points or dashes.",
      `This one is "${tag}".`,
    );
  }
  wantSession(store, session);
  const sql =
    does === "set"
      ? "INSERT OR IGNORE INTO tags (session, tag) VALUES (?, ?)"
      : "DELETE FROM tags WHERE session = ? AND tag = ?";
  return store.within((db) => db.prepare(sql).run(session, text).changes > 0);
}

/** Notes of a session, or all of them, by their place in time. */
export function notesOf(db: Database.Database, session?: number): NoteRow[] {
  return db
    .prepare(
      `SELECT id, bench, wall_ms AS at, session, who, text, picture_type AS pictureType,
       ifnull(length(picture), 0) AS pictureBytes FROM notes
       WHERE @session IS NULL OR session = @session ORDER BY wall_ms, id`,
    )
    .all({ session: session ?? null }) as NoteRow[];
}

/** Tags of a session, in alphabetical order. */
export const tagsOf = (db: Database.Database, session: number): string[] =>
  db
    .prepare("SELECT tag FROM tags WHERE session = ? ORDER BY tag")
    .pluck()
    .all(session) as string[];

/** Whether a file is old enough to have neither notes nor tags. */
export const hasNotes = (db: Database.Database): boolean =>
  db.prepare("SELECT 1 FROM sqlite_schema WHERE name = 'notes'").get() !== undefined;

function wantSession(store: Store, session: number): void {
  const found = store.within((db) =>
    db.prepare("SELECT 1 FROM sessions WHERE id = ?").get(session),
  );
  if (found === undefined) {
    throw refused(`There is no session ${session} in this record.`, "");
  }
}

/** PNG and JPEG by their first bytes. */
function pictureType(bytes: Uint8Array): string {
  if (bytes.length > PICTURE_BYTES_MAX) {
    throw refused(
      `A picture has at most ${PICTURE_BYTES_MAX} bytes.`,
      `This one has ${bytes.length}.`,
    );
  }
  const head = [...bytes.subarray(0, 4)].map((b) => b.toString(16).padStart(2, "0")).join("");
  if (head === "89504e47") return "image/png";
  if (head.startsWith("ffd8ff")) return "image/jpeg";
  throw refused("A picture is a PNG or a JPEG file.", `This one begins with ${head || "nothing"}.`);
}

const refused = (what: string, found: string): RecordProblem =>
  new RecordProblem(what, found, "Nothing was changed.");
