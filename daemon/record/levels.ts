import type Database from "better-sqlite3";
import type { Manifest } from "../model/manifest.ts";
import { Block, type Coded } from "./blocks.ts";
import { type ChannelPlace, placesOf } from "./columns.ts";
import {
  coarser,
  joined,
  packRolled,
  type Rolled,
  rollUp,
  SECOND_COLUMN,
  type Stats,
  unrolled,
} from "./rollup.ts";
import type { BlockIdentity } from "./staging.ts";

/**
 * The packed levels: a row of each grows with every block, so that few steps do not cost a head of
 * their own, until it spans ten minutes of seconds or an hour of ten seconds.
 */
const PACKED = [
  { step_s: 1, steps_max: 600 },
  { step_s: 10, steps_max: 360 },
] as const;
/** Blocks without rollups (of an older program, or after a kill) made up for at once. */
const UNROLLED_MAX = 500;
const SECONDS_A_MINUTE = 60;

/** Statistics of neighbouring blocks of one session and manifest, as one row of `rollups`. */
export interface RollupRow extends Omit<BlockIdentity, "block" | "benchFile"> {
  readonly step_s: number;
  readonly block0: number;
  readonly block1: number;
  readonly t0: number;
  readonly t1: number;
  readonly n: number;
  readonly coded: Coded;
}

/** One channel's statistics of a minute, in counts; `channel` is a row of `channels`. */
export interface MinuteStats {
  readonly channel: number;
  /** Minutes since 1970. */
  readonly minute: number;
  readonly n: number;
  readonly min: number;
  readonly mean: number;
  readonly max: number;
  readonly m2: number;
}

/** Row id in `channels` of a bench's channel. */
export type ChannelId = (place: ChannelPlace) => number;

interface Span extends BlockIdentity {
  readonly t0: number;
  readonly t1: number;
}

/** A row of one packed level that grows. */
class Growing {
  readonly step_s: number;
  readonly #steps_max: number;
  #row: { first: Span; last: Span; t0: number; t1: number; rolled: Rolled } | null = null;
  #isWritten = true;

  constructor({ step_s, steps_max }: (typeof PACKED)[number]) {
    this.step_s = step_s;
    this.#steps_max = steps_max;
  }

  /** Takes a block's statistics. What it answers is whole now, and to be written. */
  add(span: Span, rolled: Rolled): RollupRow | null {
    const before = this.#row;
    const both = before !== null && this.#fits(before, span, rolled);
    const grown = both ? joined(before.rolled, rolled) : null;
    const sealed = grown === null ? this.row() : null;
    this.#isWritten = false;
    if (before === null || grown === null) {
      this.#row = { first: span, last: span, t0: span.t0, t1: span.t1, rolled };
    } else {
      const t1 = Math.max(before.t1, span.t1);
      this.#row = { ...before, last: span, t0: Math.min(before.t0, span.t0), t1, rolled: grown };
    }
    return sealed;
  }

  #fits({ last, rolled: before }: { last: Span; rolled: Rolled }, span: Span, next: Rolled) {
    return (
      last.session === span.session &&
      last.run === span.run &&
      last.manifest === span.manifest &&
      before.steps.length + next.steps.length <= this.#steps_max
    );
  }

  /** The row as it is; null where all of it was written. */
  row(): RollupRow | null {
    if (this.#row === null || this.#isWritten) return null;
    const { first, last, t0, t1, rolled } = this.#row;
    const { session, run, manifest } = first;
    const bounds = { block0: first.block, block1: last.block, t0, t1, n: rolled.steps.length };
    return { step_s: this.step_s, session, run, manifest, ...bounds, coded: packRolled(rolled) };
  }

  wrote(): void {
    this.#isWritten = true;
  }
}

/** What a block brings to each level of rollups, and the rows that grow. */
export class Levels {
  readonly #channelId: ChannelId;
  readonly #growing = PACKED.map((level) => new Growing(level));

  constructor(channelId: ChannelId) {
    this.#channelId = channelId;
  }

  /** Takes a whole block. `sealed` are rows that will not grow any more, to be written. */
  add(
    span: Span,
    seconds: Rolled,
    manifest: Manifest,
  ): { minutes: MinuteStats[]; sealed: RollupRow[] } {
    const sealed = this.#growing.map((level) => level.add(span, coarser(seconds, level.step_s)));
    return {
      minutes: minutesOf(seconds, manifest, this.#channelId),
      sealed: sealed.filter((row) => row !== null),
    };
  }

  /** The rows that still grow and have grown since `wrote` was called last. */
  growing(): RollupRow[] {
    return this.#growing.map((level) => level.row()).filter((row) => row !== null);
  }

  wrote(): void {
    for (const level of this.#growing) level.wrote();
  }
}

/** Codes and bits have no mean. */
const hasMean = ({ channel }: ChannelPlace): boolean =>
  channel.unit !== "code" && channel.unit !== "bits";

function minutesOf(seconds: Rolled, manifest: Manifest, channelId: ChannelId): MinuteStats[] {
  const { steps, stats } = coarser(seconds, SECONDS_A_MINUTE);
  const byColumn = new Map(stats.map((s) => [s.column, s]));
  const found: MinuteStats[] = [];
  for (const place of placesOf(manifest).filter(hasMean)) {
    const s = byColumn.get(place.column);
    if (s === undefined || s.n.every((n) => n === 0)) continue;
    const channel = channelId(place);
    steps.forEach((minute, i) => {
      const n = s.n[i] as number;
      if (n === 0) return;
      const [min, max, m2] = [s.min[i] as number, s.max[i] as number, s.m2[i] as number];
      found.push({ channel, minute, n, min, mean: (s.sum[i] as number) / n, max, m2 });
    });
  }
  return found;
}

/** Adds statistics to a row of `rollup_1min` (of `rollup_1h`), merging with what is there. */
export const upsertStats = (table: "rollup_1min" | "rollup_1h", step: "minute" | "hour"): string =>
  `INSERT INTO ${table} (channel, ${step}, n, min, mean, max, m2) VALUES (?,?,?,?,?,?,?)
   ON CONFLICT DO UPDATE SET
     m2 = m2 + excluded.m2 + (excluded.mean - mean) * (excluded.mean - mean) * n * excluded.n
       / (n + excluded.n),
     mean = mean + (excluded.mean - mean) * excluded.n / (n + excluded.n),
     n = n + excluded.n, min = min(min, excluded.min), max = max(max, excluded.max)`;

export const UPSERT_ROLLUP = `INSERT INTO rollups (step_s, block0, block1, session, run, manifest,
  t0, t1, n, codec, crc, blob) VALUES (?,?,?,?,?,?,?,?,?,?,?,?)
  ON CONFLICT (step_s, block0) DO UPDATE SET block1 = excluded.block1, t0 = excluded.t0,
    t1 = excluded.t1, n = excluded.n, codec = excluded.codec, crc = excluded.crc,
    blob = excluded.blob`;

export const rollupValues = (r: RollupRow): unknown[] => [
  ...[r.step_s, r.block0, r.block1, r.session, r.run, r.manifest, r.t0, r.t1, r.n],
  ...[r.coded.codec, r.coded.crc, r.coded.blob],
];

/** The minute's statistics as values of `upsertStats`, for its minute or its hour. */
export const statsValues = (m: MinuteStats, step: "minute" | "hour"): number[] => [
  ...[m.channel, step === "minute" ? m.minute : Math.floor(m.minute / 60)],
  ...[m.n, m.min, m.mean, m.max, m.m2],
];

interface UnrolledRow extends Span {
  readonly bench: string;
  readonly json: string;
}

interface Stored {
  readonly codec: number;
  readonly crc: number;
  readonly blob: Uint8Array;
}

/**
 * Makes the rollups of blocks that have none, or only those of schema version 1: after a kill, for an
 * older program's, for a session from elsewhere. Of at most UNROLLED_MAX at once; answers of how
 * many. Until then they are read from their samples.
 */
export function rollUnrolled(
  db: Database.Database,
  channelId: (bench: string) => ChannelId,
): number {
  const rows = db
    .prepare(
      `SELECT b.id AS block, b.session, b.run, b.t0, b.t1, b.manifest, b.bench_file AS benchFile,
         u.bench, m.json
       FROM blocks b JOIN runs u ON u.id = b.run JOIN manifests m ON m.id = b.manifest
       WHERE b.rolled = 0 ORDER BY b.id LIMIT ?`,
    )
    .all(UNROLLED_MAX) as UnrolledRow[];
  const benches = new Map<string, Levels>();
  let count = 0;
  for (const row of rows) {
    const levels = benches.get(row.bench) ?? new Levels(channelId(row.bench));
    benches.set(row.bench, levels);
    if (rollOne(db, row, levels)) count++;
  }
  const upsert = db.prepare(UPSERT_ROLLUP);
  for (const levels of benches.values()) {
    for (const row of levels.growing()) upsert.run(...rollupValues(row));
  }
  return count;
}

/** Makes the minute's and hour's statistics of a session that came with its packed rollups. */
export function rollMinutes(
  db: Database.Database,
  session: number,
  channelId: (bench: string) => ChannelId,
): void {
  const rows = db
    .prepare(
      `SELECT u.bench, m.json, r.codec, r.crc, r.blob FROM rollups r JOIN runs u ON u.id = r.run
       JOIN manifests m ON m.id = r.manifest WHERE r.step_s = 1 AND r.session = ?`,
    )
    .all(session) as (Stored & { readonly bench: string; readonly json: string })[];
  for (const row of rows) {
    const manifest = JSON.parse(row.json) as Manifest;
    const block = Block.open(row.codec, row.crc, row.blob);
    const seconds = "fault" in block ? null : rolledFrom(block, manifest);
    if (seconds !== null) addMinutes(db, minutesOf(seconds, manifest, channelId(row.bench)));
  }
}

function addMinutes(db: Database.Database, minutes: readonly MinuteStats[]): void {
  const minute = db.prepare(upsertStats("rollup_1min", "minute"));
  const hour = db.prepare(upsertStats("rollup_1h", "hour"));
  for (const m of minutes) {
    minute.run(...statsValues(m, "minute"));
    hour.run(...statsValues(m, "hour"));
  }
}

function rollOne(db: Database.Database, row: UnrolledRow, levels: Levels): boolean {
  const manifest = JSON.parse(row.json) as Manifest;
  const seconds = storedSeconds(db, row.block, manifest);
  if (seconds === null) return false;
  const { minutes, sealed } = levels.add(row, seconds, manifest);
  const upsert = db.prepare(UPSERT_ROLLUP);
  for (const whole of sealed) upsert.run(...rollupValues(whole));
  addMinutes(db, minutes);
  db.prepare("DELETE FROM rollup_1s WHERE block = ?").run(row.block);
  db.prepare("UPDATE blocks SET rolled = 1 WHERE id = ?").run(row.block);
  return true;
}

/** A block's one-second statistics, as version 1 kept them or from its samples. */
function storedSeconds(db: Database.Database, id: number, manifest: Manifest): Rolled | null {
  const kept = db.prepare("SELECT codec, crc, blob FROM rollup_1s WHERE block = ?").get(id);
  const own = kept ?? db.prepare("SELECT codec, crc, blob FROM blocks WHERE id = ?").get(id);
  const { codec, crc, blob } = own as Stored;
  const block = Block.open(codec, crc, blob);
  if ("fault" in block) return null;
  return kept === undefined ? rollUp(block, manifest) : rolledFrom(block, manifest);
}

function rolledFrom(block: Block, manifest: Manifest): Rolled | null {
  const steps = block.column(SECOND_COLUMN);
  if (steps === null) return null;
  const none = new Float64Array(steps.length);
  const stats = placesOf(manifest).map(
    ({ column }): Stats =>
      unrolled(block, column) ?? { column, n: none, min: none, sum: none, max: none, m2: none },
  );
  return { steps, stats };
}
