import type { SeriesTrace } from "../model/series.ts";
import { wall } from "../model/times.ts";
import { hasNotes, tagsOf } from "./notes.ts";
import type { RecordReader, SessionRow } from "./reader.ts";

/** What one line about a session tells, in the units of the reader's converter. */
export interface SessionSummary extends SessionRow {
  readonly length_ms: number;
  /** Lowest and highest current while there was any; null where it was dark or not measured. */
  readonly current: { readonly min: number; readonly max: number } | null;
  /** Mean output of the first and of the last twentieth of the light; null where there was none. */
  readonly output: { readonly first: number; readonly last: number } | null;
  readonly trips: number;
  readonly notes: number;
  readonly tags: readonly string[];
}

/** Steps into which a session is cut for this. */
const PIXELS = 400;
/** A step belongs to the light where its mean current is at least this part of the highest. */
const LIT_PART = 0.5;
/** Part of the lit steps that stands for the beginning, and for the end. */
const END_PART = 0.05;

/** Reads what the list of sessions tells about one. Rejects with the signal's reason. */
export async function summaryOf(
  reader: RecordReader,
  session: SessionRow,
  signal?: AbortSignal,
): Promise<SessionSummary> {
  const to = Math.max(session.last, session.ended ?? session.last);
  const window = { from: session.started, to: wall(to + 1) };
  const query = { bench: session.bench, channels: ["current", "photodiode"], window };
  const answer = await reader.series({ ...query, pixels: PIXELS }, signal);
  const { current, photodiode } = answer.channels;
  const lit = current === undefined || session.kind === "dark" ? [] : litSteps(current);
  const { db } = reader.parts();
  const trips = reader
    .events({ from: window.from, to: wall(to + 1) }, session.bench)
    .filter((event) => event.kind === "trip").length;
  return {
    ...session,
    length_ms: to - session.started,
    current: current === undefined || lit.length === 0 ? null : rangeOf(current, lit),
    output: photodiode === undefined ? null : endsOf(photodiode, lit),
    trips,
    notes: hasNotes(db) ? countNotes(reader, session.id) : 0,
    tags: hasNotes(db) ? tagsOf(db, session.id) : [],
  };
}

const countNotes = (reader: RecordReader, session: number): number =>
  Number(
    reader.parts().db.prepare("SELECT count(*) FROM notes WHERE session = ?").pluck().get(session),
  );

/** Times of the steps in which light was on, as far as the current tells. */
function litSteps(current: SeriesTrace): number[] {
  const most = current.mean.reduce((a, b) => Math.max(a, b), 0);
  if (!(most > 0)) return [];
  return [...current.t].filter((_, i) => (current.mean[i] as number) >= most * LIT_PART);
}

function rangeOf(trace: SeriesTrace, times: readonly number[]): { min: number; max: number } {
  const wanted = new Set(times);
  let min = Number.POSITIVE_INFINITY;
  let max = Number.NEGATIVE_INFINITY;
  trace.t.forEach((t, i) => {
    if (!wanted.has(t)) return;
    min = Math.min(min, trace.min[i] as number);
    max = Math.max(max, trace.max[i] as number);
  });
  return { min, max };
}

function endsOf(trace: SeriesTrace, times: readonly number[]): SessionSummary["output"] {
  const wanted = new Set(times);
  const values = [...trace.mean].filter((_, i) => wanted.has(trace.t[i] as number));
  if (values.length < 2) return null;
  const n = Math.max(1, Math.floor(values.length * END_PART));
  const mean = (part: number[]): number => part.reduce((a, b) => a + b, 0) / part.length;
  return { first: mean(values.slice(0, n)), last: mean(values.slice(-n)) };
}
