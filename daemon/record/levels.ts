import type Database from "better-sqlite3";
import type { Manifest } from "../model/manifest.ts";
import { Block, type Coded } from "./blocks.ts";
import { type ChannelPlace, placesOf } from "./columns.ts";
import {
  coarser,
  joined,
  packRolled,
  type Rolled,
  type RowSource,
  rollUp,
  SECOND_COLUMN,
  type Stats,
  unrolled,
} from "./rollup.ts";
import type { BlockIdentity } from "./staging.ts";

/** A row of `rollup_10s` spans at most this many steps: an hour. */
const TENS_MAX = 360;
/** Blocks without coarser rollups (of an older program, or after a kill) made up for at an opening. */
const UNROLLED_MAX = 500;
const TENS_A_MINUTE = 6;

/** Ten-second statistics of neighbouring blocks of one session and manifest, as one row. */
export interface TensRow extends Omit<BlockIdentity, "block" | "benchFile"> {
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

/** What a block brings to each level, and the growing row of ten-second statistics. */
export class Levels {
  readonly #channelId: ChannelId;
  #tens: { first: Span; last: Span; t0: number; t1: number; rolled: Rolled } | null = null;
  #written = true;

  constructor(channelId: ChannelId) {
    this.#channelId = channelId;
  }

  /**
   * Takes a whole block. `sealed` is a row of tens that will not grow any more; it is to be written
   * before the one that `growing` gives later.
   */
  add(
    span: Span,
    source: RowSource,
    manifest: Manifest,
  ): { seconds: Coded; minutes: MinuteStats[]; sealed: TensRow | null } {
    const seconds = rollUp(source, manifest);
    return { seconds: packRolled(seconds), ...this.addSeconds(span, seconds, manifest) };
  }

  /** `add` for a block whose one-second statistics are there already. */
  addSeconds(
    span: Span,
    seconds: Rolled,
    manifest: Manifest,
  ): { minutes: MinuteStats[]; sealed: TensRow | null } {
    const rolled = coarser(seconds, 10);
    const minutes = minutesOf(rolled, manifest, this.#channelId);
    const before = this.#tens;
    const fits =
      before !== null &&
      before.last.session === span.session &&
      before.last.run === span.run &&
      before.last.manifest === span.manifest &&
      before.rolled.steps.length + rolled.steps.length <= TENS_MAX;
    const both = fits ? joined(before.rolled, rolled) : null;
    if (before !== null && both !== null) {
      const t1 = Math.max(before.t1, span.t1);
      this.#tens = { ...before, last: span, t0: Math.min(before.t0, span.t0), t1, rolled: both };
      this.#written = false;
      return { minutes, sealed: null };
    }
    const sealed = this.growing();
    this.#tens = { first: span, last: span, t0: span.t0, t1: span.t1, rolled };
    this.#written = false;
    return { minutes, sealed };
  }

  /** The row that still grows, where it has grown since `wrote` was called last. */
  growing(): TensRow | null {
    const tens = this.#tens;
    if (tens === null || this.#written) return null;
    const { session, run, manifest } = tens.first;
    const bounds = { block0: tens.first.block, block1: tens.last.block, t0: tens.t0, t1: tens.t1 };
    const n = tens.rolled.steps.length;
    return { session, run, manifest, ...bounds, n, coded: packRolled(tens.rolled) };
  }

  wrote(): void {
    this.#written = true;
  }
}

/** Codes and bits have no mean. */
const hasMean = ({ channel }: ChannelPlace): boolean =>
  channel.unit !== "code" && channel.unit !== "bits";

function minutesOf(tens: Rolled, manifest: Manifest, channelId: ChannelId): MinuteStats[] {
  const { steps, stats } = coarser(tens, TENS_A_MINUTE);
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

export const INSERT_TENS = `INSERT OR REPLACE INTO rollup_10s (id, block0, block1, session, run,
  manifest, t0, t1, n, codec, crc, blob) VALUES (?,?,?,?,?,?,?,?,?,?,?,?)`;

export const tensValues = (r: TensRow): unknown[] => [
  ...[r.block0, r.block0, r.block1, r.session, r.run, r.manifest, r.t0, r.t1, r.n],
  ...[r.coded.codec, r.coded.crc, r.coded.blob],
];

/** The minute's statistics as values of `upsertStats`, for its minute or its hour. */
export const statsValues = (m: MinuteStats, step: "minute" | "hour"): number[] => [
  ...[m.channel, step === "minute" ? m.minute : Math.floor(m.minute / 60)],
  ...[m.n, m.min, m.mean, m.max, m.m2],
];

interface UnrolledRow extends Span {
  readonly json: string;
  readonly codec: number;
  readonly crc: number;
  readonly blob: Uint8Array;
}

/**
 * Makes the coarser rollups of blocks that have none, from their one-second rollups: after a kill,
 * and for an older program's. At most UNROLLED_MAX at once; others are read from seconds meanwhile.
 */
export function rollUnrolled(db: Database.Database, channelId: (bench: string) => ChannelId): void {
  const rows = db
    .prepare(
      `SELECT b.id AS block, b.session, b.run, b.t0, b.t1, b.manifest, b.bench_file AS benchFile,
         u.bench, m.json, r.codec, r.crc, r.blob
       FROM blocks b JOIN rollup_1s r ON r.block = b.id JOIN runs u ON u.id = b.run
       JOIN manifests m ON m.id = b.manifest WHERE b.rolled = 0 ORDER BY b.id LIMIT ?`,
    )
    .all(UNROLLED_MAX) as (UnrolledRow & { bench: string })[];
  if (rows.length === 0) return;
  const tens = db.prepare(INSERT_TENS);
  const minute = db.prepare(upsertStats("rollup_1min", "minute"));
  const hour = db.prepare(upsertStats("rollup_1h", "hour"));
  const done = db.prepare("UPDATE blocks SET rolled = 1 WHERE id = ?");
  for (const bench of new Set(rows.map((row) => row.bench))) {
    const levels = new Levels(channelId(bench));
    const write = (row: TensRow | null): void => {
      if (row !== null) tens.run(...tensValues(row));
    };
    for (const row of rows.filter((r) => r.bench === bench)) {
      const manifest = JSON.parse(row.json) as Manifest;
      const seconds = storedSeconds(row, manifest);
      if (seconds === null) continue;
      const { minutes, sealed } = levels.addSeconds(row, seconds, manifest);
      write(sealed);
      for (const m of minutes) {
        minute.run(...statsValues(m, "minute"));
        hour.run(...statsValues(m, "hour"));
      }
      done.run(row.block);
    }
    write(levels.growing());
  }
}

function storedSeconds(row: UnrolledRow, manifest: Manifest): Rolled | null {
  const block = Block.open(row.codec, row.crc, row.blob);
  if ("fault" in block) return null;
  const steps = block.column(SECOND_COLUMN);
  if (steps === null) return null;
  const none = new Float64Array(steps.length);
  const stats = placesOf(manifest).map(
    ({ column }): Stats =>
      unrolled(block, column) ?? { column, n: none, min: none, sum: none, max: none, m2: none },
  );
  return { steps, stats };
}
