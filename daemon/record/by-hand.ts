import type Database from "better-sqlite3";
import {
  EPOCH_PARTS,
  type Epoch,
  type EpochFacts,
  type EpochPart,
  epochWords,
} from "../model/epoch.ts";
import type { BenchEvent } from "../model/event.ts";
import type { Reading } from "../model/reading.ts";
import { mono, wall } from "../model/times.ts";
import { RecordProblem } from "./problem.ts";
import type { Store } from "./store.ts";

/** Longest text of a note, a serial number or a name. */
const TEXT_CHARS_MAX = 500;
/** Most data-sheet values that one change has. */
const VALUES_MAX = 40;

/** Keeps a change by hand; returns its number. Throws a RecordProblem that says what is wrong. */
export function writeEpoch(store: Store, epoch: Omit<Epoch, "id">): number {
  const { bench, part, at, serial, note, who, values } = epoch;
  if (Object.keys(values).length > VALUES_MAX) {
    throw tooLong(`A change has at most ${VALUES_MAX} values.`);
  }
  for (const text of [serial, note, who, ...Object.entries(values).flat()]) wantShort(text);
  const words = JSON.stringify({ serial, note, who, values } satisfies EpochFacts);
  return store.within((db) =>
    Number(
      db
        .prepare("INSERT INTO epochs (bench, part, wall_ms, words) VALUES (?,?,?,?)")
        .run(bench, part, at, words).lastInsertRowid,
    ),
  );
}

/** Keeps a reading of a witness; returns its number. Throws a RecordProblem. */
export function writeReading(store: Store, reading: Omit<Reading, "id">): number {
  const { bench, name, at, value, unit, typed, who, note } = reading;
  if (!Number.isFinite(value)) {
    throw new RecordProblem("A reading is a number.", "This one is none.", "Read it again.");
  }
  for (const text of [name, unit, who, note]) wantShort(text);
  return store.within((db) =>
    Number(
      db
        .prepare(
          `INSERT INTO readings (bench, name, wall_ms, value, unit, typed, who, note)
           VALUES (?,?,?,?,?,?,?,?)`,
        )
        .run(bench, name, at, value, unit, typed ? 1 : 0, who, note).lastInsertRowid,
    ),
  );
}

function wantShort(text: string): void {
  if (text.length > TEXT_CHARS_MAX) {
    throw tooLong(`A text here has at most ${TEXT_CHARS_MAX} characters; one has ${text.length}.`);
  }
}

const tooLong = (found: string): RecordProblem =>
  new RecordProblem("That is too long to be kept.", found, "Shorten it. Nothing was changed.");

interface Span {
  readonly from: number;
  readonly to: number;
}
const ALWAYS: Span = { from: -Infinity, to: Infinity };

/** Changes by hand, oldest first. */
export function epochsOf(db: Database.Database, bench: string | null, span = ALWAYS): Epoch[] {
  const rows = db
    .prepare(
      `SELECT id, bench, part, wall_ms AS at, words FROM epochs
       WHERE (@bench IS NULL OR bench = @bench) AND wall_ms >= @from AND wall_ms < @to
       ORDER BY wall_ms, id`,
    )
    .all({ bench, ...span }) as {
    id: number;
    bench: string;
    part: string;
    at: number;
    words: string;
  }[];
  return rows.map(({ words, part, ...row }) => ({
    ...row,
    part: EPOCH_PARTS.find((known) => known === part) ?? ("mount" satisfies EpochPart),
    ...factsOf(words),
  }));
}

/** Words that are no facts of ours (another program's row) are a note. */
function factsOf(words: string): EpochFacts {
  const nothing = { serial: "", note: words, who: "", values: {} };
  try {
    const facts: unknown = JSON.parse(words);
    return typeof facts === "object" && facts !== null
      ? { ...nothing, note: "", ...facts }
      : nothing;
  } catch {
    return nothing;
  }
}

/** Readings of witnesses, oldest first; `name` null for all of them. */
export function readingsOf(
  db: Database.Database,
  bench: string | null,
  name: string | null,
  span = ALWAYS,
): Reading[] {
  const rows = db
    .prepare(
      `SELECT id, bench, name, wall_ms AS at, value, unit, typed, who, note FROM readings
       WHERE (@bench IS NULL OR bench = @bench) AND (@name IS NULL OR name = @name)
       AND wall_ms >= @from AND wall_ms < @to ORDER BY wall_ms, id`,
    )
    .all({ bench, name, ...span }) as (Omit<Reading, "typed"> & { typed: number })[];
  return rows.map((row) => ({ ...row, typed: row.typed === 1 }));
}

/**
 * What people did by hand, as events for the time axis: changes and typed readings. Their numbers
 * are negative, so that they never meet those of the judge.
 */
export function eventsByHand(
  db: Database.Database,
  bench: string | null,
  span: Span,
): BenchEvent[] {
  const event = (
    kind: "epoch" | "reading",
    { id, bench: of, at }: { id: number; bench: string; at: number },
    words: string,
  ): BenchEvent => ({
    id: kind === "epoch" ? -2 * id : -2 * id - 1,
    bench: of,
    input: 0,
    tick: -1,
    mono: mono(0),
    wall: wall(at),
    kind,
    hazard: "",
    data: { words, weight: "calm" },
  });
  const typed = readingsOf(db, bench, null, span).filter((reading) => reading.typed);
  return [
    ...epochsOf(db, bench, span).map((epoch) => event("epoch", epoch, epochWords(epoch))),
    ...typed.map((reading) => event("reading", reading, readingWords(reading))),
  ];
}

function readingWords({ value, unit, who, note }: Reading): string {
  const by = who === "" ? "A person" : who;
  return `${by} read ${value} ${unit}${note === "" ? "" : `: ${note.replace(/[.!]+$/, "")}`}.`;
}
