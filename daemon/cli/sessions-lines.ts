import { wall } from "../model/times.ts";
import { hasNotes, notesOf } from "../record/notes.ts";
import type { SessionRow } from "../record/reader.ts";
import { type SessionSummary, summaryOf } from "../record/session-summary.ts";
import { sha256 } from "../record/store.ts";
import { interruptible, Progress } from "./progress.ts";
import { openOrSay, type ReadInUnits, unitOf } from "./record-units.ts";
import type { SessionLine, SessionShown } from "./sessions-answers.ts";
import { outOfRecord, type RecordOptions } from "./sessions-where.ts";
import { recordFolder } from "./where.ts";

/** Opens the record meant, does something with it, and closes it whatever happens. */
export async function reading(
  options: RecordOptions,
  use: (read: ReadInUnits) => Promise<void>,
): Promise<void> {
  const read = openOrSay(options.data ?? recordFolder(options.on));
  try {
    await use(read);
    for (const fault of read.reader.faults) process.stderr.write(`Left out: ${fault}.\n`);
  } catch (error) {
    throw outOfRecord(error);
  } finally {
    read.reader.close();
  }
}

/** What the list tells about each of these sessions. */
export function linesOf(read: ReadInUnits, rows: readonly SessionRow[]): Promise<SessionLine[]> {
  const progress = new Progress("Reading");
  return interruptible(async (signal) => {
    const lines: SessionLine[] = [];
    for (const row of rows) {
      lines.push(lineOf(await summaryOf(read.reader, row, signal), read));
      progress.tell({ done: lines.length, total: rows.length });
    }
    return lines;
  }).finally(() => progress.end());
}

function lineOf(summary: SessionSummary, { conversions }: ReadInUnits): SessionLine {
  const { output } = summary;
  const unit = unitOf("photodiode", "", conversions);
  return {
    ...summary,
    tags: [...summary.tags],
    output: output === null ? null : { ...output, unit },
  };
}

/** Everything of one session. */
export async function shownOf(read: ReadInUnits, row: SessionRow): Promise<SessionShown> {
  const { reader, conversions } = read;
  const [session] = await linesOf(read, [row]);
  if (session === undefined) throw new Error("a session has no line");
  const to = wall(row.started + session.length_ms + 1);
  const window = { from: row.started, to };
  const { gaps } = await reader.series({ bench: row.bench, channels: [], window, pixels: 1 });
  const { db } = reader.parts();
  return {
    session,
    channels: reader
      .channels({ session: row.id })
      .map(({ name, unit }) => ({ name, unit: unitOf(name, unit, conversions) })),
    gaps: gaps.map(({ from, to }) => ({ from, to })),
    events: reader.events(window, row.bench).map(({ id, wall: at, kind, hazard, data }) => ({
      ...{ id, at, kind, hazard },
      words: typeof data.words === "string" ? data.words : `${kind} ${hazard}`.trim(),
    })),
    notes: hasNotes(db)
      ? notesOf(db, row.id).map(({ bench: _, session: __, ...note }) => note)
      : [],
    benchFileHash: sha256(reader.benchText(row.benchFile)),
  };
}
