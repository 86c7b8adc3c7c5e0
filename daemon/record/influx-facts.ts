import type Database from "better-sqlite3";
import type { Place } from "./influx-place.ts";
import { type Field, MEASUREMENT, type Point, real, text, whole } from "./influx-points.ts";
import type { Batch } from "./influx-source.ts";
import { type Precision, stampText } from "./influx-stamps.ts";

/** Facts of one kind sent at once. */
const FACTS_MAX = 500;
/** A stamp's nanoseconds are the fact's own number, so that facts of one moment stay apart. */
const NANOS_A_MILLI = 1_000_000;

interface FactRow {
  readonly id: number;
  readonly bench: string;
  readonly wall_ms: number;
}

/** One kind of fact: where it stands in the record, and what of it is sent. */
interface FactKind {
  readonly key: "event" | "gap" | "note" | "epoch" | "reading";
  readonly measurement: string;
  readonly sql: string;
  fields(row: Record<string, unknown>): Record<string, Field>;
}

const words = (value: unknown): Field => text(typeof value === "string" ? value : "");
const number = (value: unknown): number => Number(value ?? 0);

const KINDS: readonly FactKind[] = [
  {
    key: "event",
    measurement: MEASUREMENT.events,
    sql: "SELECT * FROM events",
    fields: (row) => ({
      input: whole(number(row.input)),
      tick: whole(number(row.tick)),
      mono_ms: real(number(row.mono_ms)),
      kind: words(row.kind),
      hazard: words(row.hazard),
      data: words(row.data),
    }),
  },
  {
    key: "gap",
    measurement: MEASUREMENT.gaps,
    sql: "SELECT *, from_wall_ms AS wall_ms FROM gaps",
    fields: (row) => ({ to_ms: real(number(row.to_wall_ms)) }),
  },
  {
    key: "note",
    measurement: MEASUREMENT.notes,
    sql: "SELECT id, bench, wall_ms, session, who, text FROM notes",
    fields: (row) => ({
      session: whole(number(row.session)),
      who: text(JSON.stringify(String(row.who))),
      text: text(JSON.stringify(String(row.text))),
    }),
  },
  {
    key: "epoch",
    measurement: MEASUREMENT.epochs,
    sql: "SELECT * FROM epochs",
    fields: (row) => ({
      part: words(row.part),
      words: text(JSON.stringify(String(row.words))),
    }),
  },
  {
    key: "reading",
    measurement: MEASUREMENT.readings,
    sql: "SELECT * FROM readings",
    fields: (row) => ({
      value: real(number(row.value)),
      name: text(JSON.stringify(String(row.name))),
      unit: words(row.unit),
    }),
  },
];

/** Events, gaps, notes, epochs, readings and sessions after a place; null where all are sent. */
export function nextFacts(db: Database.Database, place: Place, precision: Precision): Batch | null {
  const points: Point[] = [];
  const ids = {
    event: place.event,
    gap: place.gap,
    note: place.note,
    epoch: place.epoch,
    reading: place.reading,
  };
  for (const kind of KINDS) {
    const rows = db
      .prepare(`${kind.sql} WHERE id > ? ORDER BY id LIMIT ${FACTS_MAX}`)
      .all(ids[kind.key]) as (FactRow & Record<string, unknown>)[];
    for (const row of rows) {
      points.push({
        measurement: kind.measurement,
        tags: { bench: row.bench },
        fields: { id: whole(row.id), wall_ms: real(row.wall_ms), ...kind.fields(row) },
        timestamp: stampOf(row.wall_ms, row.id, precision),
      });
      ids[kind.key] = row.id;
    }
  }
  const sessions = sessionPoints(db, place, precision);
  points.push(...sessions.points);
  if (points.length === 0) return null;
  const { sessionsDone } = sessions;
  return { points, words: [], place: { ...place, ...ids, sessionsDone, sessions: sessions.sent } };
}

function stampOf(wall_ms: number, id: number, precision: Precision): string {
  const ms = Math.floor(wall_ms);
  return precision === "ms" ? String(ms) : stampText(ms, id % NANOS_A_MILLI);
}

interface SessionRow extends FactRow {
  readonly run: number;
  readonly kind: string;
  readonly ended: number | null;
  readonly last: number;
  readonly samples: number;
  readonly benchFile: number;
}

function sessionPoints(
  db: Database.Database,
  place: Place,
  precision: Precision,
): { points: Point[]; sent: Record<string, string>; sessionsDone: number } {
  const rows = db
    .prepare(
      `SELECT id, bench, run, kind, started_wall_ms AS wall_ms, ended_wall_ms AS ended,
       last_wall_ms AS last, samples, bench_file AS benchFile FROM sessions
       WHERE id > ? ORDER BY id LIMIT ${FACTS_MAX}`,
    )
    .all(place.sessionsDone) as SessionRow[];
  const points: Point[] = [];
  const sent: Record<string, string> = {};
  let { sessionsDone } = place;
  for (const row of rows) {
    const stands = JSON.stringify(row);
    if (place.sessions[row.id] !== stands) points.push(sessionPoint(row, precision));
    // What ended stays as it is; those after one that goes on are remembered until it ends.
    if (row.ended !== null && sessionsDone === row.id - 1) sessionsDone = row.id;
    else sent[row.id] = stands;
  }
  return { points, sent, sessionsDone };
}

const sessionPoint = (row: SessionRow, precision: Precision): Point => ({
  measurement: MEASUREMENT.sessions,
  tags: { bench: row.bench, session: String(row.id) },
  fields: {
    run: whole(row.run),
    kind: text(row.kind),
    started_ms: real(row.wall_ms),
    last_ms: real(row.last),
    samples: whole(row.samples),
    bench_file: whole(row.benchFile),
    ...(row.ended === null ? {} : { ended_ms: real(row.ended) }),
  },
  timestamp:
    precision === "ms" ? String(Math.floor(row.wall_ms)) : stampText(Math.floor(row.wall_ms), 0),
});
