import type { Manifest } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";
import { type Coded, type Column, packColumns } from "./blocks.ts";
import { type ChannelPlace, isFresh, placesOf } from "./columns.ts";

/**
 * One-second rollups of a block, over whole seconds of civil time. A block's rollup covers exactly
 * its own rows, so a second cut by a block's edge has a part in each; parts of one second merge.
 * Only values that are fresh and known count: a slow channel that stands still is not many readings.
 */
export const SECOND_ms = 1000;

/** Column ids of a rollup: the block's column, plus 256 for each kind. 65535 is the second itself. */
export const ROLLUP = { n: 1, min: 2, sum: 3, max: 4, m2: 5 } as const;
export const SECOND_COLUMN = 65535;
export const rollupColumn = (column: number, kind: number): number => column + 256 * kind;

/** n, min, sum, max and m2 (sum of squared differences from the mean) of stored counts. */
interface Stats {
  n: number;
  min: number;
  sum: number;
  max: number;
  m2: number;
}

const noStats = (): Stats => ({
  n: 0,
  min: Number.POSITIVE_INFINITY,
  sum: 0,
  max: Number.NEGATIVE_INFINITY,
  m2: 0,
});

/** Rows of a block as the rollup reads them. */
export interface RowSource {
  readonly n: number;
  column(id: number): Float64Array | null;
}

/** Whether row `i` counts for a channel: it was refreshed, and its value is known. */
export function countsFor(
  place: ChannelPlace,
  values: Float64Array,
  low: Float64Array,
  high: Float64Array,
  i: number,
): boolean {
  if (values[i] === place.absent) return false;
  const { index } = place.channel;
  return index < 0 || isFresh(low[i] as number, high[i] as number, index);
}

/** The rollup of a whole block, packed with the block's own codec. */
export function rollUp(rows: RowSource, manifest: Manifest): Coded {
  const wall = rows.column(ROW.wall_ms) ?? new Float64Array(rows.n);
  const slots = secondsOf(wall, rows.n);
  const second = new Float64Array(slots.seconds);
  const columns: Column[] = [{ id: SECOND_COLUMN, values: second }];
  const low = rows.column(ROW.freshLow) ?? new Float64Array(rows.n);
  const high = rows.column(ROW.freshHigh) ?? new Float64Array(rows.n);
  for (const place of placesOf(manifest)) {
    const values = rows.column(place.column);
    if (values === null) continue;
    const stats = slots.seconds.map(noStats);
    for (let i = 0; i < rows.n; i++) {
      if (!countsFor(place, values, low, high, i)) continue;
      const slot = stats[slots.ofRow[i] as number] as Stats;
      const value = values[i] as number;
      // Welford's update: exact enough for counts of any size, in one pass.
      const before = slot.n === 0 ? value : slot.sum / slot.n;
      slot.n++;
      slot.sum += value;
      slot.m2 += (value - before) * (value - slot.sum / slot.n);
      if (value < slot.min) slot.min = value;
      if (value > slot.max) slot.max = value;
    }
    const kinds = Object.entries(ROLLUP) as [keyof Stats, number][];
    for (const [key, kind] of kinds) {
      const packed = stats.map((s) => (s.n === 0 && key !== "n" ? 0 : s[key]));
      columns.push({ id: rollupColumn(place.column, kind), values: Float64Array.from(packed) });
    }
  }
  return packColumns(columns, 0, second.length);
}

/** The distinct seconds of a block in ascending order, and the slot of each row. */
function secondsOf(wall: Float64Array, n: number): { seconds: number[]; ofRow: Uint16Array } {
  const seconds = new Set<number>();
  for (let i = 0; i < n; i++) seconds.add(Math.floor((wall[i] as number) / SECOND_ms));
  const sorted = [...seconds].sort((a, b) => a - b);
  const slotOf = new Map(sorted.map((s, slot) => [s, slot]));
  const ofRow = new Uint16Array(n);
  for (let i = 0; i < n; i++) {
    ofRow[i] = slotOf.get(Math.floor((wall[i] as number) / SECOND_ms)) as number;
  }
  return { seconds: sorted, ofRow };
}
