import type { Manifest } from "../model/manifest.ts";
import { ROW } from "../model/ring.ts";
import type { Column } from "./blocks.ts";
import { type ColumnSource, columnSources, storedCount } from "./columns.ts";

/** A block ends at this many rows or after this time, whichever comes first. */
export const BLOCK_ROWS = 6000;
export const BLOCK_ms = 60_000;

/** Civil time that runs away from monotonic time by this much was stepped: a new block begins. */
export const CLOCK_STEP_ms = 1000;

/** What the rows of one block have in common. All are row ids of the store, except the manifest. */
export interface BlockIdentity {
  readonly block: number;
  readonly session: number;
  readonly run: number;
  readonly manifest: number;
  readonly benchFile: number;
}

/** The block that is growing: at most BLOCK_ROWS rows, column by column, reused without allocation. */
export class Staging {
  readonly manifest: Manifest;
  readonly columns: readonly Column[];
  n = 0;
  readonly #sources: readonly ColumnSource[];
  readonly #mono: Float64Array;
  readonly #wall: Float64Array;
  readonly #input: Float64Array;

  constructor(manifest: Manifest) {
    this.manifest = manifest;
    this.#sources = columnSources(manifest);
    this.columns = this.#sources.map(({ id }) => ({ id, values: new Float64Array(BLOCK_ROWS) }));
    this.#mono = this.column(ROW.mono_ms);
    this.#wall = this.column(ROW.wall_ms);
    this.#input = this.column(ROW.input);
  }

  /** The values of one column; zeros where this manifest has none of that id. */
  column(id: number): Float64Array {
    return this.columns.find((c) => c.id === id)?.values ?? new Float64Array(BLOCK_ROWS);
  }

  /** Whether the row at `at` of `cells` may join the rows that are here. */
  accepts(cells: Float64Array, at: number): boolean {
    if (this.n === 0) return true;
    if (this.n >= BLOCK_ROWS) return false;
    const mono = cells[at + ROW.mono_ms] as number;
    const wall = cells[at + ROW.wall_ms] as number;
    if (mono - (this.#mono[0] as number) >= BLOCK_ms) return false;
    const last = this.n - 1;
    const stepped = wall - (this.#wall[last] as number) - (mono - (this.#mono[last] as number));
    return Math.abs(stepped) < CLOCK_STEP_ms;
  }

  /** Copies one ring row; the caller has asked `accepts`. */
  push(cells: Float64Array, at: number): void {
    const sources = this.#sources;
    for (let i = 0; i < sources.length; i++) {
      const source = sources[i] as ColumnSource;
      const column = this.columns[i] as Column;
      column.values[this.n] = storedCount(cells[at + source.cell] as number, source.countsPerUnit);
    }
    this.n++;
  }

  /** Appends rows that were stored before (after a crash); columns missing there stay zero. */
  append(rows: number, stored: (id: number) => Float64Array | null): void {
    for (const column of this.columns) {
      const values = stored(column.id);
      if (values !== null) column.values.set(values.subarray(0, rows), this.n);
    }
    this.n += rows;
  }

  clear(): void {
    this.n = 0;
  }

  /** First and last civil time, and first and last input, of rows `from` … `to` (not included). */
  bounds(from: number, to: number): { t0: number; t1: number; input0: number; input1: number } {
    let t0 = Number.POSITIVE_INFINITY;
    let t1 = Number.NEGATIVE_INFINITY;
    for (let i = from; i < to; i++) {
      t0 = Math.min(t0, this.#wall[i] as number);
      t1 = Math.max(t1, this.#wall[i] as number);
    }
    return {
      t0,
      t1,
      input0: this.#input[from] as number,
      input1: this.#input[to - 1] as number,
    };
  }

  get lastMono_ms(): number {
    return this.#mono[this.n - 1] ?? Number.NaN;
  }
}
