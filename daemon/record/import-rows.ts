import type { ColumnMap } from "./import-map.ts";
import type { Source, SourceCell } from "./import-source.ts";
import type { Times } from "./import-times.ts";

/** A row that counts: its time, and one number a channel, NaN where the cell is empty. */
export interface GoodRow {
  readonly wall_ms: number;
  readonly values: Float64Array;
}

/** A row that does not count, and why. */
export interface BadRow {
  readonly line: number;
  readonly why: string;
}

/** Bad rows that are told one by one; further ones are counted. */
const BAD_TOLD_MAX = 1000;

/** Reads a source by a map. What is wrong with single rows is gathered, not thrown. */
export class RowReader {
  readonly bad: BadRow[] = [];
  badCount = 0;
  readonly #source: Source;
  readonly #map: ColumnMap;
  readonly #times: Times;
  #last_ms = Number.NEGATIVE_INFINITY;

  constructor(source: Source, map: ColumnMap, times: Times) {
    this.#source = source;
    this.#map = map;
    this.#times = times;
  }

  /** The good rows in the order of the file, which is that of time. */
  async *rows(progress: (part: number) => void): AsyncGenerator<GoodRow[]> {
    for await (const batch of this.#source.rows(progress)) {
      const good: GoodRow[] = [];
      for (const { line, cells } of batch) {
        const row = this.#row(cells);
        if (typeof row === "string") this.#refuse(line, row);
        else {
          this.#last_ms = row.wall_ms;
          good.push(row);
        }
      }
      yield good;
    }
  }

  #refuse(line: number, why: string): void {
    this.badCount++;
    if (this.bad.length < BAD_TOLD_MAX) this.bad.push({ line, why });
  }

  /** The row, or what is wrong with it. */
  #row(cells: readonly SourceCell[]): GoodRow | string {
    const { columns } = this.#source;
    if (cells.length !== columns.length) {
      return `it has ${cells.length} cells, the first line ${columns.length}`;
    }
    const stamp = this.#times.read(cells[this.#map.time] ?? null);
    if ("bad" in stamp) return stamp.bad;
    const wall_ms = stamp.at.find((at) => at > this.#last_ms);
    if (wall_ms === undefined) return "its time is not later than that of the row before";
    const values = new Float64Array(this.#map.channels.length);
    for (const [i, { name, column }] of this.#map.channels.entries()) {
      const value = numberOf(cells[column] ?? null, this.#source.decimalComma);
      if (value === null) return `its ${name} is "${String(cells[column]).slice(0, 40)}"`;
      values[i] = value;
    }
    return { wall_ms, values };
  }
}

const NUMBER = /^[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?$/;
const NOTHING = /^(nan|na|n\/a|null|-)?$/i;

/** A number, NaN for a cell that says that there is none, null for what is neither. */
function numberOf(cell: SourceCell, decimalComma: boolean): number | null {
  if (cell === null) return Number.NaN;
  if (typeof cell === "number") return cell;
  const text = cell.trim().replace("\u2212", "-");
  if (NOTHING.test(text)) return Number.NaN;
  const plain = decimalComma ? text.replace(",", ".") : text;
  return NUMBER.test(plain) ? Number(plain) : null;
}
