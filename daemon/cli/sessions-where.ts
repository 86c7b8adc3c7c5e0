import type { Command } from "commander";
import { RecordProblem } from "../record/problem.ts";
import type { RecordReader, SessionRow } from "../record/reader.ts";
import { commandOf } from "./command.ts";
import { EXIT, reasonOf, Trouble } from "./say.ts";

/** Options of every command about a record. */
export interface RecordOptions {
  readonly on?: string;
  readonly data?: string;
  readonly json?: boolean;
}

/** A part of `sessions`. */
export const recordCommandOf = (
  name: string,
  description: string,
  examples: readonly string[],
  note = "",
): Command =>
  commandOf(name, description, examples, note)
    .option("--on <name>", "which bench's record, where there are several")
    .option("--data <folder>", "the data folder or a pack, where it is not the usual one")
    .option("--json", "the answer as one JSON document");

/** The session of that number; refused where there is none. */
export function sessionNumber(text: string, reader: RecordReader): SessionRow {
  const sessions = reader.sessions();
  const session = sessions.find((s) => String(s.id) === text);
  if (session !== undefined) return session;
  const ids = sessions.map((s) => s.id);
  throw new Trouble(
    `There is no session ${text}.`,
    ids.length === 0 ? "The record is empty." : `There are ${ids.slice(-10).join(", ")}.`,
    EXIT.usage,
  );
}

/** What went wrong with a record, as a trouble with its remedy. */
export function outOfRecord(error: unknown): Trouble {
  if (error instanceof Trouble) return error;
  if (error instanceof RecordProblem) {
    return new Trouble(`${error.what} ${error.found}`.trim(), error.remedy);
  }
  return new Trouble(`That stopped: ${reasonOf(error)}.`, "Nothing of the record changed.");
}

/** A moment as people write it, wall ms since 1970. */
export function momentOf(text: string): number {
  const at = Date.parse(text);
  if (!Number.isNaN(at)) return at;
  throw new Trouble(
    `${text} is no moment.`,
    "Write it like 2026-12-01T22:00Z, or 2026-12-01T22:00 for local time.",
    EXIT.usage,
  );
}
