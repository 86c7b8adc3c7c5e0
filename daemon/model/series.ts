import type { Wall_ms } from "./times.ts";

/** A question to any store: these channels, this window, for a picture that many pixels wide. */
export interface SeriesQuery {
  readonly bench: string;
  readonly channels: readonly string[];
  readonly window: { readonly from: Wall_ms; readonly to: Wall_ms };
  readonly pixels: number;
}

/** One channel's answer: arrays of one length, one entry a pixel or a sample, `t` ascending. */
export interface SeriesTrace {
  readonly t: Float64Array;
  readonly min: Float64Array;
  readonly mean: Float64Array;
  readonly max: Float64Array;
  readonly n: Float64Array;
}

export interface SeriesAnswer {
  readonly channels: Readonly<Record<string, SeriesTrace>>;
  /** Stretches without any sample, wall milliseconds, ascending. */
  readonly gaps: readonly { readonly from: Wall_ms; readonly to: Wall_ms }[];
  /** What one entry stands for, milliseconds; 0 where entries are single samples. */
  readonly step_ms: number;
}

/** Same question and answer for SQLite, another database, a packed session and live data. */
export interface SeriesStore {
  series(query: SeriesQuery, signal?: AbortSignal): Promise<SeriesAnswer>;
}
