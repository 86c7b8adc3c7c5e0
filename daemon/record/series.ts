import { witnessOf } from "../model/reading.ts";
import { ROW } from "../model/ring.ts";
import type { SeriesAnswer, SeriesQuery, SeriesTrace } from "../model/series.ts";
import { Block } from "./blocks.ts";
import { readingsOf } from "./by-hand.ts";
import { type Chunk, ChunkIndex } from "./chunks.ts";
import { type CoarseRow, coarseRows, HOUR_ms, placeInAny } from "./coarse.ts";
import { type ChannelPlace, placeOf } from "./columns.ts";
import { gapsOf } from "./gaps.ts";
import type { Converter, ReadParts } from "./reader.ts";
import { countsFor, SECOND_COLUMN, SECOND_ms, TEN_SECONDS_ms, unrolled } from "./rollup.ts";

/** Blocks read before other work gets its turn, and an abort is looked for. */
const BLOCKS_A_TURN = 16;
/** Samples a pixel up to which each is shown by itself. */
export const SINGLES_A_PIXEL = 2;
/** From this length of a pixel on, whole hours are shown, also where they are longer than it. */
const HOURS_FROM_ms = HOUR_ms / 2;

/** Length of the statistics that are read for a pixel of this length; 0 for the samples themselves. */
export function levelFor(pixel_ms: number): number {
  if (pixel_ms >= HOURS_FROM_ms) return HOUR_ms;
  if (pixel_ms >= TEN_SECONDS_ms) return TEN_SECONDS_ms;
  return pixel_ms >= SECOND_ms ? SECOND_ms : 0;
}

/**
 * Answers a series query. Steps are counted from 1970, so that a picture that is dragged keeps its
 * values; the first and last step may reach over the window's edges and then count what is there.
 * A stretch whose full rate was retired is answered in seconds, however close one looks.
 */
export async function answerSeries(
  parts: ReadParts,
  query: SeriesQuery,
  signal?: AbortSignal,
): Promise<SeriesAnswer> {
  const { from, to } = query.window;
  const pixel_ms = Math.max(0, to - from) / Math.max(1, Math.floor(query.pixels));
  const level_ms = levelFor(pixel_ms);
  const answer = await answerAt(parts, query, pixel_ms, level_ms, signal);
  return answer ?? (await answerAt(parts, query, SECOND_ms, SECOND_ms, signal)) ?? NOTHING;
}

const NOTHING: SeriesAnswer = { channels: {}, gaps: [], step_ms: 0 };

/** The answer from one level; null where that is the samples, and some are retired. */
async function answerAt(
  parts: ReadParts,
  query: SeriesQuery,
  pixel_ms: number,
  level_ms: number,
  signal: AbortSignal | undefined,
): Promise<SeriesAnswer | null> {
  const { from, to } = query.window;
  const step_ms = level_ms > 0 ? Math.ceil(pixel_ms / level_ms) * level_ms : pixel_ms;
  const first = Math.floor(from / step_ms);
  const steps = step_ms > 0 ? Math.max(0, Math.ceil(to / step_ms) - first) : 0;
  const reach = steps > 0 ? { from: first * step_ms, to: (first + steps) * step_ms } : { from, to };
  const { index, coarse } = parts.db.transaction(() => ({
    index: new ChunkIndex(parts.db, {
      bench: query.bench,
      ...reach,
      ...(level_ms > 0 ? { unrolled: true } : {}),
    }),
    coarse: level_ms > 0 ? coarseRows(parts.db, query, reach, level_ms) : [],
  }))();
  if (level_ms === 0 && index.chunks.some((chunk) => chunk.retired === 1)) return null;
  const singles = level_ms === 0 && samplesOf(index) <= SINGLES_A_PIXEL * Math.max(1, query.pixels);
  const gatherers = new Map(
    query.channels.map((name) => [
      name,
      singles ? new Singles(from, to) : new Steps(first, steps, step_ms),
    ]),
  );
  const work = [
    ...coarse.map((row) => () => gatherCoarse(parts, row, level_ms, gatherers)),
    ...index.chunks.map((chunk) => () => {
      gatherChunk(parts, index, chunk, gatherers, level_ms > 0);
    }),
  ];
  for (let i = 0; i < work.length; i++) {
    if (i % BLOCKS_A_TURN === 0) {
      await new Promise((resolve) => setImmediate(resolve));
      signal?.throwIfAborted();
    }
    work[i]?.();
  }
  gatherReadings(parts, query, reach, gatherers);
  signal?.throwIfAborted();
  return {
    channels: Object.fromEntries([...gatherers].map(([name, g]) => [name, g.trace()])),
    gaps: gapsOf(parts.db, query.bench, from, to),
    step_ms: singles ? 0 : step_ms,
  };
}

const samplesOf = (index: ChunkIndex): number =>
  index.chunks.reduce((sum, chunk) => sum + chunk.n, 0);

/** What witnesses read stands among the channels, each reading by itself. */
function gatherReadings(
  parts: ReadParts,
  query: SeriesQuery,
  reach: { readonly from: number; readonly to: number },
  gatherers: ReadonlyMap<string, Gatherer>,
): void {
  for (const [name, gatherer] of gatherers) {
    const witness = witnessOf(name);
    if (witness === null) continue;
    for (const { at, value } of readingsOf(parts.db, query.bench, witness, reach)) {
      gatherer.add(at, value, value, value, 1);
    }
  }
}

function gatherCoarse(
  parts: ReadParts,
  row: CoarseRow,
  level_ms: number,
  gatherers: ReadonlyMap<string, Gatherer>,
): void {
  if (row.kind === "hours") {
    const gatherer = gatherers.get(row.name);
    const place = placeInAny(parts, row);
    if (gatherer === undefined || place === null) return;
    for (const [hour, n, min, mean, max] of row.hours) {
      addStats(gatherer, place, parts.convert, hour * HOUR_ms, min, mean, max, n);
    }
    return;
  }
  const block = Block.open(row.codec, row.crc, row.blob);
  if ("fault" in block) {
    parts.faults.add(`the rollup ${row.id} cannot be read: ${block.fault}`);
    return;
  }
  const manifest = parts.manifests.of(row.manifest);
  for (const [name, gatherer] of gatherers) {
    const place = placeOf(manifest, name);
    if (place !== null) gatherRollup(block, place, parts.convert, gatherer, level_ms);
  }
}

function gatherChunk(
  parts: ReadParts,
  index: ChunkIndex,
  chunk: Chunk,
  gatherers: ReadonlyMap<string, Gatherer>,
  rolled: boolean,
): void {
  const rollup = rolled ? index.openRollup(chunk) : null;
  const block = rollup ?? index.open(chunk);
  if ("fault" in block) {
    parts.faults.add(block.fault);
    return;
  }
  const manifest = parts.manifests.of(chunk.manifest);
  for (const [name, gatherer] of gatherers) {
    const place = placeOf(manifest, name);
    if (place === null) continue;
    if (rollup === null) gatherSamples(block, place, parts.convert, gatherer);
    else gatherRollup(block, place, parts.convert, gatherer, SECOND_ms);
  }
}

function gatherSamples(block: Block, place: ChannelPlace, convert: Converter, to: Gatherer): void {
  const values = block.column(place.column);
  const t = block.column(ROW.wall_ms);
  const low = block.column(ROW.freshLow);
  const high = block.column(ROW.freshHigh);
  if (values === null || t === null || low === null || high === null) return;
  for (let i = 0; i < block.n; i++) {
    if (!countsFor(place, values, low, high, i)) continue;
    const value = convert(place.channel, values[i] as number);
    to.add(t[i] as number, value, value, value, 1);
  }
}

function gatherRollup(
  block: Block,
  place: ChannelPlace,
  convert: Converter,
  to: Gatherer,
  step_ms: number,
): void {
  const steps = block.column(SECOND_COLUMN);
  const stats = unrolled(block, place.column);
  if (steps === null || stats === null) return;
  const { n, min, sum, max } = stats;
  for (let i = 0; i < block.n; i++) {
    const count = n[i] as number;
    if (count === 0) continue;
    const mean = (sum[i] as number) / count;
    const at = (steps[i] as number) * step_ms;
    addStats(to, place, convert, at, min[i] as number, mean, max[i] as number, count);
  }
}

export function addStats(
  to: Gatherer,
  place: ChannelPlace,
  convert: Converter,
  at: number,
  min: number,
  mean: number,
  max: number,
  n: number,
): void {
  const a = convert(place.channel, min);
  const b = convert(place.channel, max);
  // A thermistor's counts fall as it warms: the least count is the highest temperature.
  to.add(at, Math.min(a, b), convert(place.channel, mean), Math.max(a, b), n);
}

export interface Gatherer {
  add(t: number, min: number, mean: number, max: number, n: number): void;
  trace(): SeriesTrace;
}

/** Every sample by itself. */
export class Singles implements Gatherer {
  readonly #from: number;
  readonly #to: number;
  readonly #points: { t: number; value: number }[] = [];
  #sorted = true;

  constructor(from: number, to: number) {
    this.#from = from;
    this.#to = to;
  }

  add(t: number, value: number): void {
    if (t < this.#from || t >= this.#to) return;
    const last = this.#points[this.#points.length - 1];
    if (last !== undefined && last.t > t) this.#sorted = false;
    this.#points.push({ t, value });
  }

  trace(): SeriesTrace {
    // Civil time that was stepped back makes blocks overlap; nothing is lost or left unsorted.
    if (!this.#sorted) this.#points.sort((a, b) => a.t - b.t);
    const values = Float64Array.from(this.#points, (p) => p.value);
    return {
      t: Float64Array.from(this.#points, (p) => p.t),
      min: values,
      mean: values.slice(),
      max: values.slice(),
      n: new Float64Array(values.length).fill(1),
    };
  }
}

/** One entry a step; steps without a value are left out. `t` is the middle of the step. */
export class Steps implements Gatherer {
  readonly #first: number;
  readonly #step_ms: number;
  readonly #n: Float64Array;
  readonly #min: Float64Array;
  readonly #sum: Float64Array;
  readonly #max: Float64Array;

  constructor(first: number, steps: number, step_ms: number) {
    this.#first = first;
    this.#step_ms = step_ms;
    this.#n = new Float64Array(steps);
    this.#min = new Float64Array(steps).fill(Number.POSITIVE_INFINITY);
    this.#sum = new Float64Array(steps);
    this.#max = new Float64Array(steps).fill(Number.NEGATIVE_INFINITY);
  }

  add(t: number, min: number, mean: number, max: number, n: number): void {
    const i = Math.floor(t / this.#step_ms) - this.#first;
    if (i < 0 || i >= this.#n.length) return;
    this.#n[i] = (this.#n[i] as number) + n;
    this.#sum[i] = (this.#sum[i] as number) + mean * n;
    if (min < (this.#min[i] as number)) this.#min[i] = min;
    if (max > (this.#max[i] as number)) this.#max[i] = max;
  }

  trace(): SeriesTrace {
    const used = [...this.#n.keys()].filter((i) => (this.#n[i] as number) > 0);
    const pick = (of: (i: number) => number): Float64Array => Float64Array.from(used, of);
    return {
      t: pick((i) => (this.#first + i + 0.5) * this.#step_ms),
      min: pick((i) => this.#min[i] as number),
      mean: pick((i) => (this.#sum[i] as number) / (this.#n[i] as number)),
      max: pick((i) => this.#max[i] as number),
      n: pick((i) => this.#n[i] as number),
    };
  }
}
