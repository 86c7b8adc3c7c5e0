import type { Channel, Manifest } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";

/**
 * Which columns a block has, and under which names and scales they are asked for. Ids are stored
 * and never reused: 0 … 63 are the cells of a ring row before its values (ROW), 64 … 127 the
 * manifest's channels by index.
 */
export const CHANNEL_COLUMN = 64;

/** Stands in a scaled column for a value that was not known (NaN or infinite). */
export const NOT_KNOWN = -(2 ** 31);

/** A quantity made on this side, recorded as an integer column beside the controller's channels. */
export interface DerivedChannel {
  readonly name: string;
  readonly column: number;
  readonly unit: string;
  /** Unit per stored count. Where it is not 1, the stored count is the rounded quotient. */
  readonly perCount: number;
  /** Stored count that means "not known". */
  readonly absent: number;
}

const derived = (
  name: string,
  column: number,
  unit: string,
  perCount: number,
  absent = NOT_KNOWN,
): DerivedChannel => ({ name, column, unit, perCount, absent });

export const DERIVED: readonly DerivedChannel[] = [
  derived("judge.asked", ROW.asked_mA, "mA", 0.01),
  derived("judge.aim", ROW.aim_mA, "mA", 0.01),
  derived("judge.ceiling", ROW.ceiling_mA, "mA", 0.01),
  /** Index into MAKERS of model/ceiling.ts. */
  derived("judge.maker", ROW.maker, "code", 1),
  derived("judge.floor", ROW.floor_mA, "mA", 0.01),
  derived("judge.expected", ROW.expected_mW, "mW", 0.01),
  /** Index into STATES, and FLAG bits, of judge/records.ts. */
  derived("judge.state", ROW.state, "code", 1),
  derived("judge.flags", ROW.flags, "bits", 1),
  /** Age of the last permit on its arrival at the board: the true loop delay, on one clock. */
  derived("link.loopDelay", ROW.ackAge_ticks, "tick", 1, -1),
];

/** Scale of each ring cell that is stored as an integer count; other cells are stored as they are. */
const SCALED = new Map(DERIVED.filter((d) => d.absent === NOT_KNOWN).map((d) => [d.column, d]));

/** What a stored count of a named channel means. */
export interface ChannelPlace {
  readonly channel: Channel;
  readonly column: number;
  readonly absent: number;
}

/** Where a channel of that name lies in blocks of this manifest; null where it has none. */
export function placeOf(manifest: Manifest, name: string): ChannelPlace | null {
  const own = manifest.channels.find((channel) => channel.name === name);
  if (own !== undefined) {
    return { channel: own, column: CHANNEL_COLUMN + own.index, absent: Number.NaN };
  }
  const made = DERIVED.find((d) => d.name === name);
  if (made === undefined) return null;
  const ticks = made.unit === "tick";
  return {
    channel: {
      index: -1,
      name,
      unit: ticks ? "ms" : made.unit,
      perCount: ticks ? manifest.tick_us / 1000 : made.perCount,
      count_min: NOT_KNOWN,
      count_max: -NOT_KNOWN,
      group: 0,
    },
    column: made.column,
    absent: made.absent,
  };
}

/** Every channel that blocks of this manifest hold: the controller's, then those made here. */
export const placesOf = (manifest: Manifest): ChannelPlace[] =>
  [...manifest.channels, ...DERIVED]
    .map((c) => placeOf(manifest, c.name))
    .filter((place) => place !== null);

/** Cell of a ring row, and the scale it is stored at (0 for as it is), for every column of a block. */
export interface ColumnSource {
  readonly id: number;
  readonly cell: number;
  readonly countsPerUnit: number;
}

/** The columns of a block of this manifest. */
export function columnSources(manifest: Manifest): ColumnSource[] {
  const sources: ColumnSource[] = Object.values(ROW)
    .filter((cell) => cell < ROW.values)
    .map((cell) => {
      const scaled = SCALED.get(cell);
      return { id: cell, cell, countsPerUnit: scaled === undefined ? 0 : 1 / scaled.perCount };
    });
  for (const { index } of manifest.channels) {
    sources.push({ id: CHANNEL_COLUMN + index, cell: ROW.values + index, countsPerUnit: 0 });
  }
  return sources;
}

/** A cell as it is stored: the rounded count, or NOT_KNOWN where there is none. */
export function storedCount(value: number, countsPerUnit: number): number {
  if (countsPerUnit === 0) return value;
  const count = Math.round(value * countsPerUnit);
  return Math.abs(count) < -NOT_KNOWN ? count + 0 : NOT_KNOWN;
}

/** Whether channel `index` was refreshed by the row whose two bit sets these are. */
export const isFresh = (low: number, high: number, index: number): boolean =>
  ((index < 32 ? low : high) & (1 << (index & 31))) !== 0;
