import { witnessOf } from "../model/reading.ts";
import { ROW } from "../model/ring.ts";
import type { SeriesAnswer, SeriesQuery, SeriesTrace } from "../model/series.ts";
import type { Block } from "./blocks.ts";
import { readingsOf } from "./by-hand.ts";
import { type Chunk, ChunkIndex } from "./chunks.ts";
import { type ChannelPlace, placeOf } from "./columns.ts";
import { gapsOf } from "./gaps.ts";
import type { Converter, ReadParts } from "./reader.ts";
import { countsFor, ROLLUP, rollupColumn, SECOND_COLUMN, SECOND_ms } from "./rollup.ts";

/** Blocks read before other work gets its turn, and an abort is looked for. */
const BLOCKS_A_TURN = 16;
/** Samples a pixel up to which each is shown by itself. */
const SINGLES_A_PIXEL = 2;

/**
 * Answers a series query. Steps are counted from 1970, so that a picture that is dragged keeps its
 * values; the first and last step may reach over the window's edges and then count what is there.
 */
export async function answerSeries(
  parts: ReadParts,
  query: SeriesQuery,
  signal?: AbortSignal,
): Promise<SeriesAnswer> {
  const { from, to } = query.window;
  const pixels = Math.max(1, Math.floor(query.pixels));
  const pixel_ms = Math.max(0, to - from) / pixels;
  const rolled = pixel_ms >= SECOND_ms;
  const step_ms = rolled ? Math.ceil(pixel_ms / SECOND_ms) * SECOND_ms : pixel_ms;
  const first = Math.floor(from / step_ms);
  const steps = step_ms > 0 ? Math.max(0, Math.ceil(to / step_ms) - first) : 0;
  const reach = { from: first * step_ms, to: (first + steps) * step_ms };
  const index = new ChunkIndex(parts.db, {
    bench: query.bench,
    ...(steps > 0 ? reach : { from, to }),
  });
  const samples = index.chunks.reduce((sum, chunk) => sum + chunk.n, 0);
  const singles = !rolled && samples <= SINGLES_A_PIXEL * pixels;
  const gatherers = new Map(
    query.channels.map((name) => [
      name,
      singles ? new Singles(from, to) : new Steps(first, steps, step_ms),
    ]),
  );
  for (let i = 0; i < index.chunks.length; i++) {
    if (i % BLOCKS_A_TURN === 0) {
      await new Promise((resolve) => setImmediate(resolve));
      signal?.throwIfAborted();
    }
    gatherChunk(parts, index, index.chunks[i] as Chunk, gatherers, rolled);
  }
  for (const [name, gatherer] of gatherers) gatherWitness(parts, query, name, gatherer);
  signal?.throwIfAborted();
  return {
    channels: Object.fromEntries([...gatherers].map(([name, g]) => [name, g.trace()])),
    gaps: gapsOf(parts.db, query.bench, from, to),
    step_ms: singles ? 0 : step_ms,
  };
}

/** A witness reads by itself, a few times a second at most: single values beside the blocks. */
function gatherWitness({ db }: ReadParts, query: SeriesQuery, name: string, to: Gatherer): void {
  const witness = witnessOf(name);
  if (witness === null) return;
  for (const { at, value } of readingsOf(db, query.bench, witness, query.window)) {
    to.add(at, value, value, value, 1);
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
    else gatherRollup(block, place, parts.convert, gatherer);
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

function gatherRollup(block: Block, place: ChannelPlace, convert: Converter, to: Gatherer): void {
  const kind = (k: number): Float64Array | null => block.column(rollupColumn(place.column, k));
  const second = block.column(SECOND_COLUMN);
  const n = kind(ROLLUP.n);
  const min = kind(ROLLUP.min);
  const sum = kind(ROLLUP.sum);
  const max = kind(ROLLUP.max);
  if (second === null || n === null || min === null || sum === null || max === null) return;
  for (let i = 0; i < block.n; i++) {
    const count = n[i] as number;
    if (count === 0) continue;
    const a = convert(place.channel, min[i] as number);
    const b = convert(place.channel, max[i] as number);
    const mean = convert(place.channel, (sum[i] as number) / count);
    // A thermistor's counts fall as it warms: the least count is the highest temperature.
    to.add((second[i] as number) * SECOND_ms, Math.min(a, b), mean, Math.max(a, b), count);
  }
}

interface Gatherer {
  add(t: number, min: number, mean: number, max: number, n: number): void;
  trace(): SeriesTrace;
}

/** Every sample by itself. */
class Singles implements Gatherer {
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
class Steps implements Gatherer {
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
