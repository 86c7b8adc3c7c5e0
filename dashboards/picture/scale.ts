/** Scales: plain functions from a value to a pixel. Nothing here knows of panels or frames. */
export type Scale = (value: number) => number;

/** Straight from [a, b] to [c, d]; where a equals b everything lands on c. */
export const linear =
  (a: number, b: number, c: number, d: number): Scale =>
  (value) =>
    a === b ? c : c + ((d - c) * (value - a)) / (b - a);

export interface Bounds {
  readonly low: number;
  readonly high: number;
}

/** Smallest and largest of the finite numbers; undefined where there is none. */
export function extent(values: Iterable<number>): Bounds | undefined {
  let low = Number.POSITIVE_INFINITY;
  let high = Number.NEGATIVE_INFINITY;
  for (const value of values) {
    if (!Number.isFinite(value)) continue;
    if (value < low) low = value;
    if (value > high) high = value;
  }
  return high >= low ? { low, high } : undefined;
}

const below = (value: number, step: number): number => Math.floor(value / step + 1e-9) * step;
const above = (value: number, step: number): number => Math.ceil(value / step - 1e-9) * step;

/**
 * Heights of the corridor, mA. The scale starts a little under the floor, not at zero, so that the
 * room under the ceiling can be seen; `shown` are currents that must lie on it (the present one
 * while it flows). In whole steps, so that it does not creep with every sample.
 */
export function corridorBounds(
  ceiling: Iterable<number>,
  floor: Iterable<number>,
  shown: readonly number[],
): Bounds {
  const top = extent([...ceiling, ...shown]);
  if (top === undefined) return { low: 0, high: 1000 };
  const bottom = extent([...floor, ...shown, top.low]) ?? top;
  const range = Math.max(top.high - bottom.low, top.high * 0.08, 1);
  const step = range > 300 ? 50 : 10;
  const low = below(bottom.low - 0.16 * range, step);
  return { low: low < 0.15 * top.high ? 0 : low, high: above(top.high + 0.02 * range, step) };
}

/** The output's scale reaches at least this high, mW: a converter's noise is no picture. */
const OUTPUT_mW_min = 10;

/** Heights of the output, mW, from what was measured and expected while light was meant. */
export function outputBounds(lit: Iterable<number>): Bounds {
  const known = [...lit].filter((v) => Number.isFinite(v) && v > 0).sort((a, b) => a - b);
  const high = known[known.length - 1];
  const low = known[Math.floor(known.length * 0.05)];
  if (high === undefined || low === undefined) return { low: 0, high: OUTPUT_mW_min };
  if (high < OUTPUT_mW_min) return { low: 0, high: OUTPUT_mW_min };
  return {
    low: low > 0.5 * high ? low - 0.9 * (high * 1.06 - low) - 0.1 * high : 0,
    high: high * 1.06,
  };
}

/** Heights of the case strip, °C: the trip level is its wall and always in sight. */
export function caseBounds(readings: Iterable<number>, trip: number | null): Bounds {
  const seen = extent(readings) ?? { low: 20, high: 25 };
  const wall = trip ?? seen.high + 10;
  return { low: Math.min(below(seen.low - 2, 2), wall - 20), high: Math.max(wall, seen.high) + 2 };
}

/** Lengths of the past that can be looked at, minutes. */
export const SPANS_min = [2, 5, 10, 20, 40] as const;

/** The shortest span that holds a record of that age. */
export const spanFor = (length_ms: number): number =>
  SPANS_min.find((span) => length_ms <= span * 60_000) ?? 40;
