/** Something about the data folder that a person must mend: what, what was found, what to do. */
export class RecordProblem extends Error {
  readonly what: string;
  readonly found: string;
  readonly remedy: string;

  constructor(what: string, found: string, remedy: string) {
    super(`${what} ${found} ${remedy}`);
    this.name = "RecordProblem";
    this.what = what;
    this.found = found;
    this.remedy = remedy;
  }
}

/** The code of an SQLite or system error ("SQLITE_FULL", "EACCES"), or "" for anything else. */
export function errorCode(error: unknown): string {
  if (error instanceof Error && "code" in error && typeof error.code === "string") {
    return error.code;
  }
  return "";
}

/** The message of whatever was thrown. */
export const errorText = (error: unknown): string =>
  error instanceof Error ? error.message : String(error);

/** A failed write or open of the record, said so that somebody knows what to do. */
export function problemOf(error: unknown, folder: string): RecordProblem {
  if (error instanceof RecordProblem) return error;
  const code = errorCode(error);
  const what = `The record in ${folder} cannot be written.`;
  if (code === "SQLITE_FULL" || code === "ENOSPC" || code === "EDQUOT") {
    return new RecordProblem(
      what,
      "The disk is full.",
      "Free some space there; recording goes on by itself.",
    );
  }
  if (code.startsWith("SQLITE_READONLY") || code === "EROFS" || code === "EACCES") {
    return new RecordProblem(
      what,
      `The folder is read-only for this user (${code}).`,
      "Give this user the right to write there, or name another folder with --data.",
    );
  }
  if (code === "SQLITE_NOTADB" || code.startsWith("SQLITE_CORRUPT")) {
    return new RecordProblem(
      what,
      `Its record.sqlite is damaged or no record (${code}).`,
      "Name another folder with --data; keep this one, samples may still be read from it.",
    );
  }
  if (code.startsWith("SQLITE_IOERR") || code === "EIO" || code.startsWith("SQLITE_CANTOPEN")) {
    return new RecordProblem(
      what,
      `The disk answered with an error (${code}).`,
      "Look at the disk and its cable; recording goes on by itself when it answers again.",
    );
  }
  return new RecordProblem(
    what,
    `${errorText(error)}${code === "" ? "" : ` (${code})`}.`,
    "Name another folder with --data if this stays.",
  );
}
