import { createReadStream, statSync } from "node:fs";
import { asyncBufferFromFile, parquetMetadataAsync, parquetReadObjects } from "hyparquet";
import { RecordProblem } from "./problem.ts";

/** A cell as the file has it. */
export type SourceCell = string | number | null;

/** One row and where it stands: a line of a text file, or a row of a Parquet file, from 1. */
export interface SourceRow {
  readonly line: number;
  readonly cells: readonly SourceCell[];
}

/** A file of rows under named columns, read as often as wanted, a batch at a time. */
export interface Source {
  readonly columns: readonly string[];
  /** Whether 1,5 is one number there: no comma separates its cells. */
  readonly decimalComma: boolean;
  rows(progress: (part: number) => void): AsyncGenerator<SourceRow[]>;
}

/** Opens a CSV or a Parquet file. Throws a RecordProblem that says what is wrong with it. */
export async function openSource(file: string): Promise<Source> {
  try {
    return file.endsWith(".parquet") ? await openParquet(file) : await openCsv(file);
  } catch (error) {
    if (error instanceof RecordProblem) throw error;
    throw new RecordProblem(
      `${file} cannot be read.`,
      `${error instanceof Error ? error.message : String(error)}.`,
      "Name a CSV file, or a Parquet file that ends in .parquet. Nothing was changed.",
    );
  }
}

const HEAD_BYTES = 65_536;

async function openCsv(file: string): Promise<Source> {
  let head = "";
  for await (const piece of createReadStream(file, { encoding: "utf8", end: HEAD_BYTES })) {
    head += piece;
  }
  const first = head.replace(/^\ufeff/, "").split(/\r?\n/)[0] ?? "";
  const separator = separatorOf(first);
  const cutter = new CsvCutter(separator);
  const columns = (cutter.push(`${first}\n`)[0]?.cells ?? []).map((c) => String(c ?? "").trim());
  if (columns.length < 2) {
    throw new RecordProblem(
      `${file} has no columns.`,
      `Its first line is "${first.slice(0, 60)}".`,
      "A CSV file begins with a line of names, with commas, semicolons or tabs between.",
    );
  }
  return {
    columns,
    decimalComma: separator !== ",",
    rows: (progress) => csvRows(file, separator, progress),
  };
}

/** The character of , ; and tab that stands most often in the first line. */
function separatorOf(line: string): string {
  const count = (c: string): number => line.split(c).length;
  return [",", ";", "\t"].reduce((best, c) => (count(c) > count(best) ? c : best));
}

async function* csvRows(
  file: string,
  separator: string,
  progress: (part: number) => void,
): AsyncGenerator<SourceRow[]> {
  const cutter = new CsvCutter(separator);
  const stream = createReadStream(file, { encoding: "utf8" });
  const { size } = statSync(file);
  let isHead = true;
  for await (const piece of stream) {
    const rows = cutter.push(String(piece));
    progress(stream.bytesRead / size);
    if (isHead && rows.length > 0) {
      rows.shift();
      isHead = false;
    }
    yield rows;
  }
  const rest = cutter.end();
  if (!isHead) yield rest;
}

/** Cuts CSV text (RFC 4180) into rows, wherever the pieces are cut; quoted cells may hold lines. */
export class CsvCutter {
  readonly #separator: string;
  #cells: string[] = [];
  #cell = "";
  #state: "plain" | "quoted" | "quote" = "plain";
  #line = 1;
  #rowLine = 1;
  #isFirst = true;

  constructor(separator: string) {
    this.#separator = separator;
  }

  push(text: string): SourceRow[] {
    const rows: SourceRow[] = [];
    const from = this.#isFirst && text.startsWith("\ufeff") ? 1 : 0;
    if (text !== "") this.#isFirst = false;
    for (let i = from; i < text.length; i++) this.#take(text[i] as string, rows);
    return rows;
  }

  /** The last row, where the file does not end with a line end. */
  end(): SourceRow[] {
    const rows: SourceRow[] = [];
    if (this.#cell !== "" || this.#cells.length > 0) this.#endRow(rows);
    return rows;
  }

  #take(c: string, rows: SourceRow[]): void {
    if (this.#state === "quoted") {
      if (c === '"') this.#state = "quote";
      else {
        if (c === "\n") this.#line++;
        this.#cell += c;
      }
      return;
    }
    if (c === '"' && (this.#state === "quote" || this.#cell === "")) {
      if (this.#state === "quote") this.#cell += c;
      this.#state = "quoted";
      return;
    }
    this.#state = "plain";
    if (c === this.#separator) {
      this.#cells.push(this.#cell);
      this.#cell = "";
    } else if (c === "\n") {
      this.#line++;
      this.#endRow(rows);
      this.#rowLine = this.#line;
    } else if (c !== "\r") this.#cell += c;
  }

  #endRow(rows: SourceRow[]): void {
    const cells = [...this.#cells, this.#cell];
    this.#cells = [];
    this.#cell = "";
    this.#state = "plain";
    // An empty line is no row.
    if (cells.length > 1 || cells[0] !== "") rows.push({ line: this.#rowLine, cells });
  }
}

const PARQUET_ROWS = 10_000;

async function openParquet(file: string): Promise<Source> {
  const buffer = await asyncBufferFromFile(file);
  const metadata = await parquetMetadataAsync(buffer);
  const columns = metadata.schema.slice(1).map((element) => element.name);
  const total = Number(metadata.num_rows);
  return {
    columns,
    decimalComma: false,
    async *rows(progress) {
      for (let at = 0; at < total; at += PARQUET_ROWS) {
        const rowEnd = Math.min(total, at + PARQUET_ROWS);
        const objects = await parquetReadObjects({ file: buffer, metadata, rowStart: at, rowEnd });
        progress(rowEnd / total);
        yield objects.map((row, i) => ({
          line: at + i + 1,
          cells: columns.map((name) => cellOf(row[name])),
        }));
      }
    },
  };
}

function cellOf(value: unknown): SourceCell {
  if (typeof value === "number" || typeof value === "string") return value;
  if (typeof value === "bigint") return Number(value);
  if (value instanceof Date) return value.toISOString();
  return null;
}
