import type { Quantity, Row } from "../now/track.ts";

/** The rows of one picture, one a column of pixels, as columns of numbers. */
export type Columns = Readonly<Record<Quantity | "t" | "x", readonly number[]>>;

/** How time lies on the picture. Columns stand on a grid of absolute time, so that lines do not
 * shimmer as they slide, and they slide by whole pixels. */
export interface TimeAxis {
  /** Time at the now line, ms since 1970, on the grid. */
  readonly now: number;
  /** Milliseconds in one pixel. */
  readonly msPerPx: number;
  /** Where the now line stands, px. */
  readonly x0: number;
}

/** The axis of a past of `span_min` minutes ending at `at`, over `width` px. */
export function timeAxis(at: number, span_min: number, width: number): TimeAxis {
  const msPerPx = (span_min * 60_000) / Math.max(1, width);
  return { now: Math.floor(at / msPerPx) * msPerPx, msPerPx, x0: width };
}

export const xAt = (axis: TimeAxis, t: number): number => axis.x0 - (axis.now - t) / axis.msPerPx;

/** Time under a pixel. */
export const timeAt = (axis: TimeAxis, x: number): number =>
  axis.now - (axis.x0 - x) * axis.msPerPx;

const KEYS = "t current ceiling floor maker asked output expected degC state".split(" ") as (
  | Quantity
  | "t"
)[];

/** The last row of every pixel column in sight; a row where nothing is known is always kept. */
export function columnsOf(rows: readonly Row[], axis: TimeAxis): Columns {
  const out = Object.fromEntries(["x", ...KEYS].map((key) => [key, [] as number[]])) as Record<
    Quantity | "t" | "x",
    number[]
  >;
  let last = Number.NEGATIVE_INFINITY;
  for (const row of rows) {
    const column = Math.floor(row.t / axis.msPerPx);
    const x = axis.x0 - (Math.round(axis.now / axis.msPerPx) - column);
    if (x < -2 || x > axis.x0) continue;
    const known = Number.isFinite(row.ceiling) || Number.isFinite(row.degC);
    const before = out.x.length - 1;
    const lastKnown = before < 0 || Number.isFinite(out.ceiling[before] ?? out.degC[before] ?? 0);
    const replaces = column === last && known && lastKnown;
    const i = replaces ? before : before + 1;
    out.x[i] = x;
    for (const key of KEYS) out[key][i] = row[key];
    last = column;
  }
  return out;
}
