import { fileWriter, ParquetWriter } from "hyparquet-writer";
import type { ExportColumn, ExportRow } from "./export-rows.ts";

/** Rows of one group: large enough to pack well, small enough to be held in memory. */
const GROUP_ROWS = 50_000;

const NOTHING = { repetition_type: "OPTIONAL" } as const;

/**
 * Writes rows into a Parquet file, a group at a time: time in UTC to the microsecond, bench, session, then one
 * column a channel, empty where that sample did not bring it. The file is whole after `close`.
 */
export class ParquetFile {
  readonly #writer: ParquetWriter;
  readonly #columns: readonly ExportColumn[];
  #rows: ExportRow[] = [];

  constructor(file: string, columns: readonly ExportColumn[]) {
    this.#columns = columns;
    this.#writer = new ParquetWriter({
      writer: fileWriter(file),
      createdBy: "beamsitter",
      kvMetadata: columns.map(({ name, unit }) => ({ key: `unit of ${name}`, value: unit })),
      schema: [
        { name: "root", num_children: columns.length + 3 },
        {
          name: "time",
          type: "INT64",
          converted_type: "TIMESTAMP_MICROS",
          repetition_type: "REQUIRED",
        },
        { name: "bench", type: "BYTE_ARRAY", converted_type: "UTF8", repetition_type: "REQUIRED" },
        { name: "session", type: "INT32", repetition_type: "REQUIRED" },
        ...columns.map(({ name, holds }) =>
          holds === "numbers"
            ? ({ name, type: "DOUBLE", ...NOTHING } as const)
            : ({ name, type: "BYTE_ARRAY", converted_type: "UTF8", ...NOTHING } as const),
        ),
      ],
    });
  }

  async add(rows: readonly ExportRow[]): Promise<void> {
    for (const row of rows) this.#rows.push(row);
    if (this.#rows.length >= GROUP_ROWS) await this.#write();
  }

  async close(): Promise<void> {
    if (this.#rows.length > 0) await this.#write();
    await this.#writer.finish();
  }

  async #write(): Promise<void> {
    const rows = this.#rows;
    this.#rows = [];
    await this.#writer.write({
      rowGroupSize: rows.length,
      columnData: [
        {
          name: "time",
          data: BigInt64Array.from(rows, (r) => BigInt(Math.round(r.wall_ms * 1000))),
        },
        { name: "bench", data: rows.map((row) => row.bench) },
        { name: "session", data: Int32Array.from(rows, (row) => row.session) },
        ...this.#columns.map(({ name }, i) => ({
          name,
          data: rows.map((row) => row.cells[i] ?? null),
        })),
      ],
    });
  }
}
