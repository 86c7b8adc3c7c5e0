import { STATES } from "../judge/records.ts";
import { MAKERS } from "../model/ceiling.ts";
import { ROW } from "../model/ring.ts";
import type { Block } from "./blocks.ts";
import { type Chunk, type ChunkFilter, ChunkIndex } from "./chunks.ts";
import { placeOf } from "./columns.ts";
import type { ReadParts, RecordReader } from "./reader.ts";
import { countsFor } from "./rollup.ts";
import type { Done } from "./work.ts";

/** What is exported. Without session and window it is all that the folder has. */
export interface RowsQuery {
  readonly bench?: string;
  readonly session?: number;
  /** Civil time, milliseconds since 1970; `to` is not included. */
  readonly from?: number;
  readonly to?: number;
  readonly channels: readonly { readonly name: string; readonly unit: string }[];
  readonly rate: Rate;
}

/** Every sample, or one row a step of civil time with each channel's mean, or its least and most. */
export type Rate =
  | { readonly kind: "full" }
  | { readonly kind: "mean" | "minmax"; readonly step_ms: number };

/** A cell: a value in units, a word, or nothing where that sample did not bring it. */
export type Cell = number | string | null;

/** A column of what is exported. Words stand in columns without a unit. */
export interface ExportColumn {
  readonly name: string;
  readonly unit: string;
  readonly holds: "numbers" | "words";
}

export interface ExportRow {
  readonly wall_ms: number;
  readonly bench: string;
  readonly session: number;
  readonly cells: readonly Cell[];
}

/** Digits beyond what any converter here can give. */
const DIGITS = 9;

/** Codes that people read better as words. */
const WORDS: Readonly<Record<string, readonly string[]>> = {
  "judge.state": STATES,
  "judge.maker": MAKERS,
};

/** Codes and bits have no mean, and no least or most: only full rate has them. */
const isReducible = ({ name, unit }: RowsQuery["channels"][number]): boolean =>
  !(name in WORDS) && unit !== "code" && unit !== "bits";

const channelsOf = ({ channels, rate }: RowsQuery): RowsQuery["channels"] =>
  rate.kind === "full" ? channels : channels.filter(isReducible);

/** The columns that a query gives. */
export function columnsOf(query: RowsQuery): ExportColumn[] {
  const { rate } = query;
  return channelsOf(query).flatMap(({ name, unit }): ExportColumn[] => {
    if (name in WORDS) return [{ name, unit: "", holds: "words" }];
    if (rate.kind !== "minmax") return [{ name, unit, holds: "numbers" }];
    return [`${name}.min`, `${name}.max`].map((n) => ({ name: n, unit, holds: "numbers" }));
  });
}

/**
 * The rows of a query, a stored block at a time, in the order in which they were recorded; memory
 * is bounded by one block. Damaged blocks are named in the reader's `faults` and left out.
 */
export function* rowsOf(
  reader: RecordReader,
  query: RowsQuery,
  progress: (done: Done) => void,
): Generator<ExportRow[]> {
  const parts = reader.parts();
  const index = new ChunkIndex(parts.db, filterOf(query));
  const benches = benchesOf(parts);
  const names = channelsOf(query).map(({ name }) => name);
  const steps = query.rate.kind === "full" ? null : new Steps(query.rate, names.length);
  for (const [i, chunk] of index.chunks.entries()) {
    progress({ done: i, total: index.chunks.length });
    const block = index.open(chunk);
    if ("fault" in block) {
      parts.faults.add(block.fault);
      continue;
    }
    const bench = benches.get(chunk.run) ?? "";
    const rows = blockRows(parts, chunk, block, names, query, bench);
    yield steps === null ? rows : steps.take(rows);
  }
  if (steps !== null) yield steps.end();
}

function filterOf({ bench, session, from, to }: RowsQuery): ChunkFilter {
  return {
    ...(bench === undefined ? {} : { bench }),
    ...(session === undefined ? {} : { session }),
    ...(from === undefined ? {} : { from }),
    ...(to === undefined ? {} : { to }),
  };
}

function benchesOf({ db }: ReadParts): Map<number, string> {
  const rows = db.prepare("SELECT id, bench FROM runs").all() as { id: number; bench: string }[];
  return new Map(rows.map(({ id, bench }) => [id, bench]));
}

function blockRows(
  parts: ReadParts,
  chunk: Chunk,
  block: Block,
  names: readonly string[],
  query: RowsQuery,
  bench: string,
): ExportRow[] {
  const walls = block.column(ROW.wall_ms) ?? new Float64Array(block.n);
  const cells = names.map((name) => cellsOf(parts, chunk, block, name));
  const { from = Number.NEGATIVE_INFINITY, to = Number.POSITIVE_INFINITY } = query;
  const rows: ExportRow[] = [];
  for (let i = 0; i < block.n; i++) {
    const wall_ms = walls[i] as number;
    if (wall_ms < from || wall_ms >= to) continue;
    rows.push({ wall_ms, bench, session: chunk.session, cells: cells.map((cell) => cell(i)) });
  }
  return rows;
}

/** One channel's cell in row `i` of a block. */
function cellsOf(parts: ReadParts, chunk: Chunk, block: Block, name: string): (i: number) => Cell {
  const place = placeOf(parts.manifests.of(chunk.manifest), name);
  const values = place === null ? null : block.column(place.column);
  const low = block.column(ROW.freshLow);
  const high = block.column(ROW.freshHigh);
  if (place === null || values === null || low === null || high === null) return () => null;
  const words = WORDS[name];
  return (i) => {
    if (!countsFor(place, values, low, high, i)) return null;
    const count = values[i] as number;
    if (words !== undefined) return words[count] ?? String(count);
    const value = parts.convert(place.channel, count);
    return Number.isFinite(value) ? Number(value.toPrecision(DIGITS)) : null;
  };
}

/** Gathers samples into steps of civil time; a step is told once a later one begins. */
class Steps {
  readonly #step_ms: number;
  readonly #kind: "mean" | "minmax";
  readonly #n: Float64Array;
  readonly #sum: Float64Array;
  readonly #min: Float64Array;
  readonly #max: Float64Array;
  #step = Number.NaN;
  #of: ExportRow | null = null;

  constructor(rate: Exclude<Rate, { kind: "full" }>, channels: number) {
    this.#step_ms = rate.step_ms;
    this.#kind = rate.kind;
    this.#n = new Float64Array(channels);
    this.#sum = new Float64Array(channels);
    this.#min = new Float64Array(channels);
    this.#max = new Float64Array(channels);
  }

  take(rows: readonly ExportRow[]): ExportRow[] {
    const told: ExportRow[] = [];
    for (const row of rows) {
      const step = Math.floor(row.wall_ms / this.#step_ms);
      if (step !== this.#step || row.session !== this.#of?.session) {
        told.push(...this.end());
        this.#step = step;
        this.#of = row;
      }
      row.cells.forEach((cell, i) => {
        this.#add(i, cell);
      });
    }
    return told;
  }

  /** The step that stands open, as a row at its beginning; none where none does. */
  end(): ExportRow[] {
    const of = this.#of;
    if (of === null) return [];
    const cells: Cell[] = [];
    this.#n.forEach((n, i) => {
      const [sum, min, max] = [
        this.#sum[i] as number,
        this.#min[i] as number,
        this.#max[i] as number,
      ];
      if (this.#kind === "mean") cells.push(n === 0 ? null : Number((sum / n).toPrecision(DIGITS)));
      else cells.push(n === 0 ? null : min, n === 0 ? null : max);
    });
    this.#n.fill(0);
    this.#sum.fill(0);
    this.#of = null;
    return [{ ...of, wall_ms: this.#step * this.#step_ms, cells }];
  }

  #add(i: number, cell: Cell): void {
    if (typeof cell !== "number") return;
    const n = this.#n[i] as number;
    this.#n[i] = n + 1;
    this.#sum[i] = (this.#sum[i] as number) + cell;
    this.#min[i] = n === 0 ? cell : Math.min(this.#min[i] as number, cell);
    this.#max[i] = n === 0 ? cell : Math.max(this.#max[i] as number, cell);
  }
}
