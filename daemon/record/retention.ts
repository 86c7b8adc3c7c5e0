import type Database from "better-sqlite3";
import { CODEC } from "./blocks.ts";
import type { Store } from "./store.ts";
import type { Work } from "./work.ts";

/**
 * Which full-rate blocks may go; their rollups, events, notes and all else stay for ever. A block
 * goes where it is older than `fullRate_ms` or where all blocks together are larger than
 * `fullRate_bytes` (oldest first), unless it is kept or not yet carried to where it must be.
 */
export interface RetentionRule {
  readonly fullRate_ms: number | null;
  readonly fullRate_bytes: number | null;
  /** Only what was exported to this target may go; null for anything. */
  readonly exportedTo: string | null;
}

export interface Retired {
  readonly blocks: number;
  readonly samples: number;
  readonly bytes: number;
  /** Blocks that the rule would take, if they were exported. */
  readonly waiting: number;
  readonly words: string;
}

/** Around a trip the full rate stays: what led to it, and what followed, milliseconds. */
const BEFORE_TRIP_ms = 120_000;
const AFTER_TRIP_ms = 30_000;
/** Blocks taken in one write: the recorder waits for no longer than that. */
const BLOCKS_A_STEP = 100;
const DAY_ms = 86_400_000;

/**
 * A block overlaps a stretch that is kept: named in `kept`, or around a trip. The rows of `blocks`
 * are the outer query's.
 */
const IS_KEPT = `(
  EXISTS (SELECT 1 FROM kept k WHERE k.bench = u.bench
    AND k.to_wall_ms >= b.t0 AND k.from_wall_ms <= b.t1)
  OR EXISTS (SELECT 1 FROM events e WHERE e.bench = u.bench AND e.kind = 'trip'
    AND e.wall_ms >= b.t0 - ${AFTER_TRIP_ms} AND e.wall_ms <= b.t1 + ${BEFORE_TRIP_ms}))`;
const IS_EXPORTED = `(@target IS NULL OR EXISTS (SELECT 1 FROM exported x
  WHERE x.bench = u.bench AND x.target = @target
  AND x.from_wall_ms <= b.t0 AND x.to_wall_ms >= b.t1))`;
/** Full-rate blocks whose rollups are there, of sessions that have ended. */
const CANDIDATES = `FROM blocks b JOIN runs u ON u.id = b.run JOIN sessions s ON s.id = b.session
  WHERE b.codec <> ${CODEC.retired} AND b.rolled = 1 AND s.ended_wall_ms IS NOT NULL
  AND (@bench IS NULL OR u.bench = @bench)`;

interface Candidate {
  readonly id: number;
  readonly bench: string;
  readonly t0: number;
  readonly t1: number;
  readonly n: number;
  readonly bytes: number;
}

/**
 * Takes the full rate of what the rule names, some blocks at a time, and writes down what it took.
 * Ending it early leaves the rest as it was.
 * @param bench of that bench only; null for all
 */
export function* retire(
  store: Store,
  bench: string | null,
  rule: RetentionRule,
  now_ms: number,
): Work<Retired> {
  const { chosen, waiting } = store.within((db) => choose(db, bench, rule, now_ms));
  let bytes = 0;
  let samples = 0;
  for (let i = 0; i < chosen.length; i += BLOCKS_A_STEP) {
    const step = chosen.slice(i, i + BLOCKS_A_STEP);
    store.within((db) => takeAway(db, step, rule, now_ms));
    for (const block of step) {
      bytes += block.bytes;
      samples += block.n;
    }
    yield { done: i + step.length, total: chosen.length };
  }
  const found = { blocks: chosen.length, samples, bytes, waiting };
  return { ...found, words: wordsOf(found, chosen, rule) };
}

function choose(
  db: Database.Database,
  bench: string | null,
  rule: RetentionRule,
  now_ms: number,
): { chosen: Candidate[]; waiting: number } {
  const rows = db
    .prepare(
      `SELECT b.id, u.bench, b.t0, b.t1, b.n, length(b.blob) AS bytes, ${IS_KEPT} AS isKept,
         ${IS_EXPORTED} AS isExported ${CANDIDATES} ORDER BY b.t0, b.id`,
    )
    .all({ bench, target: rule.exportedTo }) as (Candidate & {
    readonly isKept: 0 | 1;
    readonly isExported: 0 | 1;
  })[];
  let left = rows.reduce((sum, row) => sum + row.bytes, 0);
  const chosen: Candidate[] = [];
  let waiting = 0;
  for (const row of rows) {
    const isOld = rule.fullRate_ms !== null && row.t1 < now_ms - rule.fullRate_ms;
    const isMuch = rule.fullRate_bytes !== null && left > rule.fullRate_bytes;
    if ((!isOld && !isMuch) || row.isKept === 1) continue;
    if (row.isExported === 0) {
      waiting++;
      continue;
    }
    left -= row.bytes;
    chosen.push(row);
  }
  return { chosen, waiting };
}

function takeAway(
  db: Database.Database,
  blocks: readonly Candidate[],
  rule: RetentionRule,
  now_ms: number,
): void {
  const take = db.prepare(
    `UPDATE blocks SET codec = ${CODEC.retired}, crc = 0, blob = x'' WHERE id = ?`,
  );
  const note = db.prepare(
    `INSERT INTO retired (bench, at_wall_ms, from_wall_ms, to_wall_ms, blocks, samples, bytes, rule)
     VALUES (?,?,?,?,?,?,?,?)`,
  );
  for (const block of blocks) take.run(block.id);
  for (const bench of new Set(blocks.map((block) => block.bench))) {
    const own = blocks.filter((block) => block.bench === bench);
    const sum = (of: (block: Candidate) => number): number =>
      own.reduce((total, block) => total + of(block), 0);
    const from = Math.min(...own.map((block) => block.t0));
    const to = Math.max(...own.map((block) => block.t1));
    const figures = [own.length, sum((b) => b.n), sum((b) => b.bytes)];
    note.run(bench, now_ms, from, to, ...figures, JSON.stringify(rule));
  }
}

function wordsOf(
  { blocks, samples, bytes, waiting }: Omit<Retired, "words">,
  chosen: readonly Candidate[],
  rule: RetentionRule,
): string {
  const wait =
    waiting === 0
      ? ""
      : ` ${waiting} blocks wait: they are not yet exported to ${String(rule.exportedTo)}.`;
  if (blocks === 0) return `Nothing is taken away.${wait}`;
  const day = (t: number): string => new Date(t).toISOString().slice(0, 16).replace("T", " ");
  const from = day(Math.min(...chosen.map((block) => block.t0)));
  const to = day(Math.max(...chosen.map((block) => block.t1)));
  return (
    `The full rate of ${samples} samples from ${from} to ${to} UTC is taken away, ` +
    `${(bytes / 1e6).toFixed(1)} MB; their statistics from one second on stay.${wait}`
  );
}

/** A rule from days and gigabytes as people say them. */
export const ruleOf = (
  days: number | null,
  gigabytes: number | null,
  exportedTo: string | null,
): RetentionRule => ({
  fullRate_ms: days === null ? null : days * DAY_ms,
  fullRate_bytes: gigabytes === null ? null : gigabytes * 1e9,
  exportedTo,
});
