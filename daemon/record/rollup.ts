import type { Manifest } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";
import type { Block, Coded, Column } from "./blocks.ts";
import { packColumns } from "./blocks.ts";
import { type ChannelPlace, isFresh, placesOf } from "./columns.ts";

/**
 * Rollups of a block, over whole seconds of civil time. A block's rollup covers exactly its own rows,
 * so a second cut by a block's edge has a part in each; parts of one second merge. Only values that
 * are fresh and known count: a slow channel that stands still is not many readings.
 */
export const SECOND_ms = 1000;
export const TEN_SECONDS_ms = 10_000;

/**
 * Column ids of a rollup: the block's column, plus 256 for each kind. 65535 is the step itself, in
 * steps since 1970. Kind 5 is what schema version 1 wrote: m2 as a double. `spread` is the standard
 * deviation in sixteenths of a count: finer than a hundred samples can tell it. Where the steps'
 * n differ, `over` stands in place of the sum: sum − n × `base`, which packs better.
 */
export const ROLLUP = { n: 1, min: 2, sum: 3, max: 4, m2: 5, spread: 6, over: 7, base: 8 } as const;
export const SECOND_COLUMN = 65535;
export const rollupColumn = (column: number, kind: number): number => column + 256 * kind;
const SPREADS_PER_COUNT = 16;

/** Statistics of one column, an entry a step; where n is 0, the others are 0. */
export interface Stats {
  readonly column: number;
  readonly n: Float64Array;
  readonly min: Float64Array;
  readonly sum: Float64Array;
  readonly max: Float64Array;
  /** Sum of squared differences from the mean. */
  readonly m2: Float64Array;
}

/** A stretch's statistics in steps of one length; `steps` counts them since 1970, ascending. */
export interface Rolled {
  readonly steps: Float64Array;
  readonly stats: readonly Stats[];
}

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

/** One-second statistics of the rows of a block. */
export function rollUp(rows: RowSource, manifest: Manifest): Rolled {
  const zeros = new Float64Array(rows.n);
  const wall = rows.column(ROW.wall_ms) ?? zeros;
  const low = rows.column(ROW.freshLow) ?? zeros;
  const high = rows.column(ROW.freshHigh) ?? zeros;
  const { steps, ofRow } = secondsOf(wall, rows.n);
  const stats: Stats[] = [];
  for (const place of placesOf(manifest)) {
    const values = rows.column(place.column);
    if (values === null) continue;
    const s = noStats(place.column, steps.length);
    // Squares of differences from one of the values: whole numbers, so the sums are exact.
    let about = Number.NaN;
    for (let i = 0; i < rows.n; i++) {
      if (!countsFor(place, values, low, high, i)) continue;
      const at = ofRow[i] as number;
      const value = values[i] as number;
      const n = s.n[at] as number;
      if (Number.isNaN(about)) about = value;
      if (n === 0 || value < (s.min[at] as number)) s.min[at] = value;
      if (n === 0 || value > (s.max[at] as number)) s.max[at] = value;
      s.n[at] = n + 1;
      s.sum[at] = (s.sum[at] as number) + value;
      s.m2[at] = (s.m2[at] as number) + (value - about) ** 2;
    }
    for (let at = 0; at < steps.length; at++) {
      const n = s.n[at] as number;
      const over = (s.sum[at] as number) - n * about;
      if (n > 0) s.m2[at] = Math.max(0, (s.m2[at] as number) - (over * over) / n);
    }
    stats.push(s);
  }
  return { steps, stats };
}

const noStats = (column: number, length: number): Stats => ({
  column,
  n: new Float64Array(length),
  min: new Float64Array(length),
  sum: new Float64Array(length),
  max: new Float64Array(length),
  m2: new Float64Array(length),
});

/** The distinct seconds of a block in ascending order, and the place of each row's. */
function secondsOf(wall: Float64Array, n: number): { steps: Float64Array; ofRow: Uint16Array } {
  const ofRow = new Uint16Array(n);
  const found: number[] = [];
  let sorted = true;
  for (let i = 0; i < n; i++) {
    const second = Math.floor((wall[i] as number) / SECOND_ms);
    const last = found[found.length - 1];
    if (last === undefined || second > last) found.push(second);
    else if (second < last) sorted = false;
    ofRow[i] = found.length - 1;
  }
  if (sorted) return { steps: Float64Array.from(found), ofRow };
  const seconds = new Set<number>();
  for (let i = 0; i < n; i++) seconds.add(Math.floor((wall[i] as number) / SECOND_ms));
  const steps = Float64Array.from(seconds).sort();
  const placeOf = new Map([...steps].map((second, place) => [second, place]));
  for (let i = 0; i < n; i++) {
    ofRow[i] = placeOf.get(Math.floor((wall[i] as number) / SECOND_ms)) ?? 0;
  }
  return { steps, ofRow };
}

/** The same statistics in steps `factor` times as long. */
export function coarser(fine: Rolled, factor: number): Rolled {
  const found: number[] = [];
  const places = Array.from(fine.steps, (step) => {
    const coarse = Math.floor(step / factor);
    if (found[found.length - 1] !== coarse) found.push(coarse);
    return found.length - 1;
  });
  return {
    steps: Float64Array.from(found),
    stats: fine.stats.map((s) => merged(s, places, found)),
  };
}

/** Two neighbouring stretches as one, `next` the later; null where it is not, or other columns. */
export function joined(before: Rolled, next: Rolled): Rolled | null {
  const last = before.steps[before.steps.length - 1] ?? Number.NEGATIVE_INFINITY;
  if ((next.steps[0] ?? Number.NEGATIVE_INFINITY) < last) return null;
  if (before.stats.length !== next.stats.length) return null;
  const steps = Float64Array.from([...before.steps, ...next.steps]);
  const stats = before.stats.map((a, i) => {
    const b = next.stats[i] as Stats;
    const both = (key: keyof Omit<Stats, "column">): Float64Array =>
      Float64Array.from([...a[key], ...b[key]]);
    return {
      column: a.column,
      n: both("n"),
      min: both("min"),
      sum: both("sum"),
      max: both("max"),
      m2: both("m2"),
    };
  });
  return coarser({ steps, stats }, 1);
}

/** Merges entries that fall into one place (T. F. Chan and others, 1979, for m2). */
function merged(fine: Stats, places: readonly number[], found: readonly number[]): Stats {
  const out = noStats(fine.column, found.length);
  places.forEach((at, i) => {
    const n = fine.n[i] as number;
    if (n === 0) return;
    const before = out.n[at] as number;
    const sum = fine.sum[i] as number;
    if (before > 0) {
      const apart = sum / n - (out.sum[at] as number) / before;
      out.m2[at] =
        (out.m2[at] as number) +
        (fine.m2[i] as number) +
        (apart * apart * before * n) / (before + n);
    } else out.m2[at] = fine.m2[i] as number;
    const min = fine.min[i] as number;
    const max = fine.max[i] as number;
    if (before === 0 || min < (out.min[at] as number)) out.min[at] = min;
    if (before === 0 || max > (out.max[at] as number)) out.max[at] = max;
    out.n[at] = before + n;
    out.sum[at] = (out.sum[at] as number) + sum;
  });
  return out;
}

/** Packed with the block's own codec. */
export function packRolled({ steps, stats }: Rolled): Coded {
  const columns: Column[] = [{ id: SECOND_COLUMN, values: steps }];
  for (const s of stats) {
    const add = (kind: number, values: Float64Array): void =>
      void columns.push({ id: rollupColumn(s.column, kind), values });
    add(ROLLUP.n, s.n);
    // A column that has no value anywhere is told by its n alone.
    if (s.n.every((n) => n === 0)) continue;
    add(ROLLUP.min, s.min);
    add(ROLLUP.max, s.max);
    const spread = (m2: number, i: number): number =>
      Math.round(SPREADS_PER_COUNT * Math.sqrt(m2 / Math.max(1, s.n[i] as number)));
    add(ROLLUP.spread, s.m2.map(spread));
    if (s.n.every((n) => n === s.n[0])) {
      add(ROLLUP.sum, s.sum);
      continue;
    }
    const base = Math.round(total(s.sum) / total(s.n));
    add(ROLLUP.base, new Float64Array(steps.length).fill(base));
    add(
      ROLLUP.over,
      s.sum.map((sum, i) => sum - base * (s.n[i] as number)),
    );
  }
  return packColumns(columns, 0, steps.length);
}

const total = (values: Float64Array): number => values.reduce((a, b) => a + b, 0);

/** A packed rollup's statistics of one column; null where it has no value of it. */
export function unrolled(block: Block, column: number): Stats | null {
  const kind = (k: number): Float64Array | null => block.column(rollupColumn(column, k));
  const n = kind(ROLLUP.n);
  const min = kind(ROLLUP.min);
  const max = kind(ROLLUP.max);
  if (n === null || min === null || max === null) return null;
  const sum = kind(ROLLUP.sum) ?? sumFrom(n, kind(ROLLUP.base), kind(ROLLUP.over));
  if (sum === null) return null;
  return {
    column,
    n,
    min,
    max,
    sum,
    // Asked for by few, so it is decoded only then.
    get m2() {
      const spread = kind(ROLLUP.spread);
      if (spread === null) return kind(ROLLUP.m2) ?? new Float64Array(block.n);
      return spread.map((s, i) => (n[i] as number) * (s / SPREADS_PER_COUNT) ** 2);
    },
  };
}

function sumFrom(
  n: Float64Array,
  base: Float64Array | null,
  over: Float64Array | null,
): Float64Array | null {
  if (base === null || over === null) return null;
  return over.map((o, i) => o + (base[i] as number) * (n[i] as number));
}
