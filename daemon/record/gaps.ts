import type Database from "better-sqlite3";
import type { SeriesAnswer } from "../model/series.ts";
import { wall } from "../model/times.ts";

/**
 * What a window's last samples may lack because they are still on their way to the disk: a shorter
 * stretch without samples at its end is not called a gap.
 */
export const LIVE_EDGE_ms = 2500;

/** The plus keeps SQLite from sorting all blocks of a run to find its first. */
const OF_BENCH = "+run IN (SELECT id FROM runs WHERE bench = @bench)";

/** Stretches of a window without any sample of a bench: those stored, and those at its edges. */
export function gapsOf(
  db: Database.Database,
  bench: string,
  from: number,
  to: number,
): SeriesAnswer["gaps"] {
  if (!(to > from)) return [];
  const read = db.transaction(() => ({
    gaps: db
      .prepare(
        `SELECT from_wall_ms AS a, to_wall_ms AS b FROM gaps
         WHERE bench = @bench AND to_wall_ms > @from AND from_wall_ms < @to ORDER BY a`,
      )
      .all({ bench, from, to }) as { a: number; b: number }[],
    first: db
      .prepare(
        `SELECT min(t0) FROM (SELECT min(t0) AS t0 FROM tail WHERE ${OF_BENCH}
         UNION ALL SELECT * FROM
           (SELECT t0 FROM blocks WHERE ${OF_BENCH} ORDER BY t0 LIMIT 1))`,
      )
      .pluck()
      .get({ bench }) as number | null,
    last: db
      .prepare("SELECT max(last_wall_ms) FROM sessions WHERE bench = @bench AND samples > 0")
      .pluck()
      .get({ bench }) as number | null,
  }))();
  return gapsWithin(read, from, to);
}

/**
 * The gaps of a window: those found in it, and its edges before the first and after the last sample
 * that there is at all (null where there is none).
 */
export function gapsWithin(
  read: {
    readonly gaps: readonly { readonly a: number; readonly b: number }[];
    readonly first: number | null;
    readonly last: number | null;
  },
  from: number,
  to: number,
): SeriesAnswer["gaps"] {
  const { first, last } = read;
  if (first === null || last === null) return [{ from: wall(from), to: wall(to) }];
  const found = [...read.gaps];
  if (first > from) found.unshift({ a: from, b: first });
  if (to - last > LIVE_EDGE_ms) found.push({ a: last, b: to });
  return found.map(({ a, b }) => ({ from: wall(Math.max(a, from)), to: wall(Math.min(b, to)) }));
}
