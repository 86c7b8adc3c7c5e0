import type Database from "better-sqlite3";
import type { SeriesQuery } from "../model/series.ts";
import { type ChannelPlace, placeOf } from "./columns.ts";
import type { ReadParts } from "./reader.ts";

/** Statistics coarser than a second, as a query reads them. */
export const HOUR_ms = 3_600_000;
/** A row of `rollups` spans an hour, or a little more where blocks stick out of it. */
const SPAN_ms_MAX = 2 * HOUR_ms;

export type CoarseRow =
  | {
      readonly kind: "packed";
      readonly id: number;
      readonly manifest: number;
      readonly codec: number;
      readonly crc: number;
      readonly blob: Uint8Array;
    }
  | {
      readonly kind: "hours";
      readonly name: string;
      readonly unit: string;
      readonly perCount: number;
      /** Hours since 1970, then the statistics in counts. */
      readonly hours: readonly (readonly [number, number, number, number, number])[];
    };

interface Reach {
  readonly from: number;
  readonly to: number;
}

/** Rows of the level, taken along whole: the newest of them still grows. */
export function coarseRows(
  db: Database.Database,
  query: SeriesQuery,
  reach: Reach,
  level_ms: number,
): CoarseRow[] {
  return level_ms === HOUR_ms
    ? hourRows(db, query, reach)
    : packedRows(db, query.bench, reach, level_ms / 1000);
}

function packedRows(
  db: Database.Database,
  bench: string,
  { from, to }: Reach,
  step_s: number,
): CoarseRow[] {
  const rows = db
    .prepare(
      `SELECT id, manifest, codec, crc, blob FROM rollups
       WHERE step_s = @step_s AND t0 >= @from - @span AND t1 >= @from AND t0 < @to
         AND run IN (SELECT id FROM runs WHERE bench = @bench)`,
    )
    .all({ step_s, from, to, bench, span: SPAN_ms_MAX }) as Omit<
    CoarseRow & { kind: "packed" },
    "kind"
  >[];
  return rows.map((row) => ({ kind: "packed", ...row }));
}

function hourRows(db: Database.Database, query: SeriesQuery, { from, to }: Reach): CoarseRow[] {
  const channels = db
    .prepare("SELECT id, name, unit, per_count AS perCount FROM channels WHERE bench = ?")
    .all(query.bench) as { id: number; name: string; unit: string; perCount: number }[];
  const hours = db
    .prepare(
      `SELECT hour, n, min, mean, max FROM rollup_1h
       WHERE channel = ? AND hour >= ? AND hour < ?`,
    )
    .raw();
  return channels
    .filter(({ name }) => query.channels.includes(name))
    .map(({ id, ...channel }) => ({
      kind: "hours",
      ...channel,
      hours: hours.all(id, Math.floor(from / HOUR_ms), Math.ceil(to / HOUR_ms)) as [
        number,
        number,
        number,
        number,
        number,
      ][],
    }));
}

/** A channel of that name and scale, of any manifest that the record has. */
export function placeInAny(
  parts: ReadParts,
  wanted: { readonly name: string; readonly unit: string; readonly perCount: number },
): ChannelPlace | null {
  const ids = parts.db.prepare("SELECT id FROM manifests ORDER BY id DESC").pluck().all();
  for (const id of ids as number[]) {
    const place = placeOf(parts.manifests.of(id), wanted.name);
    if (place?.channel.unit === wanted.unit && place.channel.perCount === wanted.perCount) {
      return place;
    }
  }
  return null;
}
