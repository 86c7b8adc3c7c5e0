import { z } from "zod";
import type { SeriesAnswer, SeriesQuery } from "../model/series.ts";
import { wall } from "../model/times.ts";

/** More channels than a board can have in one question is a mistake. */
const CHANNELS_MAX = 80;
/** Widest picture asked for, pixels: a 5 K screen. */
const PIXELS_MAX = 5200;
/** Longest window in one question, ms: a year. */
const WINDOW_ms_MAX = 366 * 24 * 3_600_000;

const time = z.coerce.number().min(0).max(8.64e15);
const window = z
  .object({ from: time, to: time })
  .refine((w) => w.to > w.from, "to must be later than from")
  .refine((w) => w.to - w.from <= WINDOW_ms_MAX, "a window is at most a year");

const SeriesParams = z.intersection(
  window,
  z.object({
    channels: z
      .string()
      .transform((text) => text.split(",").filter((name) => name !== ""))
      .pipe(
        z
          .array(z.string().regex(/^[A-Za-z0-9_.-]{1,64}$/))
          .min(1)
          .max(CHANNELS_MAX),
      ),
    pixels: z.coerce.number().int().min(1).max(PIXELS_MAX),
  }),
);

/** A question from an address, or one sentence on what is wrong with it. */
export type Asked<T> =
  | { readonly ok: true; readonly value: T }
  | { readonly ok: false; readonly words: string };

function parsed<T, U>(schema: z.ZodType<T>, params: unknown, make: (value: T) => U): Asked<U> {
  const result = schema.safeParse(params);
  if (result.success) return { ok: true, value: make(result.data) };
  const issue = result.error.issues[0];
  const where = issue?.path.join(".") || "the address";
  return { ok: false, words: `${where}: ${issue?.message ?? "not understood"}.` };
}

/** `?channels=a,b&from=&to=&pixels=` as a question to the store; times in ms since 1970. */
export const parseSeries = (bench: string, params: unknown): Asked<SeriesQuery> =>
  parsed(SeriesParams, params, ({ channels, from, to, pixels }) => ({
    bench,
    channels,
    window: { from: wall(from), to: wall(to) },
    pixels,
  }));

/** `?from=&to=` of the events. */
export const parseWindow = (params: unknown): Asked<SeriesQuery["window"]> =>
  parsed(window, params, ({ from, to }) => ({ from: wall(from), to: wall(to) }));

/** Six significant digits: finer than any converter here, and a third of the bytes. */
const plain = (values: Float64Array): (number | null)[] =>
  Array.from(values, (v) => (Number.isFinite(v) ? Number(v.toPrecision(6)) : null));

const times = (values: Float64Array): number[] => Array.from(values, (v) => Math.round(v));

/** A store's answer as JSON: typed arrays become lists, what is not known becomes null. */
export function seriesJson(answer: SeriesAnswer): SeriesJson {
  const channels: Record<string, TraceJson> = {};
  for (const [name, trace] of Object.entries(answer.channels)) {
    channels[name] = {
      t: times(trace.t),
      min: plain(trace.min),
      mean: plain(trace.mean),
      max: plain(trace.max),
      n: times(trace.n),
    };
  }
  return { channels, gaps: answer.gaps, step_ms: answer.step_ms };
}

export interface TraceJson {
  readonly t: readonly number[];
  readonly min: readonly (number | null)[];
  readonly mean: readonly (number | null)[];
  readonly max: readonly (number | null)[];
  readonly n: readonly number[];
}

export interface SeriesJson {
  readonly channels: Readonly<Record<string, TraceJson>>;
  readonly gaps: readonly { readonly from: number; readonly to: number }[];
  readonly step_ms: number;
}
