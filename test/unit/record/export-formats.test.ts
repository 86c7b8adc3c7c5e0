import { join } from "node:path";
import { DuckDBInstance } from "@duckdb/node-api";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { ROW } from "../../../daemon/model/ring.ts";
import { ParquetFile } from "../../../daemon/record/export-parquet.ts";
import {
  columnsOf,
  type ExportRow,
  type Rate,
  type RowsQuery,
  rowsOf,
} from "../../../daemon/record/export-rows.ts";
import { csvHead, csvRow, influxRow, jsonRow } from "../../../daemon/record/export-text.ts";
import { openReader, type RecordReader } from "../../../daemon/record/reader.ts";
import { rowMaker, START_ms } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const COUNT = 3000;
const scratch = scratchFolder();
let reader: RecordReader;
let rows: Float64Array[];
beforeAll(() => {
  const make = rowMaker(6, (i) => i * 50);
  rows = recordRows(scratch.folder, make, COUNT);
  reader = openReader(scratch.folder);
});
afterAll(() => {
  reader.close();
  scratch.remove();
});

const CHANNELS = [
  { name: "current", unit: "mA" },
  { name: "sink", unit: "degC" },
  { name: "judge.state", unit: "code" },
];
const query = (rate: Rate): RowsQuery => ({ session: 1, channels: CHANNELS, rate });
const exported = (q: RowsQuery): ExportRow[] => [...rowsOf(reader, q, () => undefined)].flat();
const currents = (from: number, to: number): number[] =>
  rows.slice(from, to).map((row) => (row[ROW.values + 1] as number) * 0.5);
const FULL = query({ kind: "full" });

/** Whole seconds of civil time do not begin with the first sample: it lies at a whole minute. */
const STEP_ms = 10_000;
const STEP_ROWS = STEP_ms / 50;

describe("rows", () => {
  test("at full rate are the samples, with nothing where nothing came", () => {
    const found = exported(FULL);
    expect(found.map((row) => row.cells[0])).toEqual(currents(0, COUNT));
    expect(found[0]).toMatchObject({ wall_ms: START_ms, bench: "north", session: 1 });
    expect(found.map((row) => row.cells[1] !== null)).toEqual(rows.map((_, i) => i % 2 === 0));
  });

  test("of means and of bounds are plain statistics over their step, and codes are left out", () => {
    const means = exported(query({ kind: "mean", step_ms: STEP_ms }));
    const bounds = exported(query({ kind: "minmax", step_ms: STEP_ms }));
    const first = Math.floor(START_ms / STEP_ms) * STEP_ms;
    expect(START_ms - first).toBe(0);
    expect(means).toHaveLength(COUNT / STEP_ROWS);
    means.forEach(({ wall_ms, cells }, i) => {
      const values = currents(i * STEP_ROWS, (i + 1) * STEP_ROWS);
      expect(wall_ms).toBe(first + i * STEP_ms);
      expect(cells).toHaveLength(2);
      expect(cells[0]).toBeCloseTo(values.reduce((a, b) => a + b, 0) / STEP_ROWS, 5);
      expect(bounds[i]?.cells.slice(0, 2)).toEqual([Math.min(...values), Math.max(...values)]);
    });
    expect(columnsOf(query({ kind: "minmax", step_ms: STEP_ms })).map((c) => c.name)).toEqual([
      ...["current.min", "current.max", "sink.min", "sink.max"],
    ]);
  });

  test("of a window end before its end", () => {
    const found = exported({ ...FULL, from: START_ms + 1000, to: START_ms + 2000 });
    expect(found.map((row) => row.cells[0])).toEqual(currents(20, 40));
  });
});

describe("formats", () => {
  const columns = columnsOf(FULL);
  const row: ExportRow = {
    wall_ms: START_ms + 0.25,
    bench: "north, 2",
    session: 4,
    cells: [1.5, null, 'a "word"'],
  };

  test("JSON lines", () => {
    expect(JSON.parse(jsonRow(columns, row))).toEqual({
      time: new Date(START_ms).toISOString(),
      bench: "north, 2",
      session: 4,
      current: 1.5,
      "judge.state": 'a "word"',
    });
  });

  test("InfluxDB lines: names escaped, words quoted, nanoseconds, nothing for an empty row", () => {
    expect(influxRow(columns, row)).toBe(
      `beamsitter_export,bench=north\\,\\ 2,session=4 current=1.5,judge.state="a \\"word\\"" ${START_ms}250000\n`,
    );
    expect(influxRow(columns, { ...row, cells: [null, null, null] })).toBe("");
  });

  test("CSV of steps", () => {
    expect(csvHead(columns, "brackets")).toBe(
      "time [UTC],session,current [mA],sink [degC],judge.state\r\n",
    );
    expect(csvHead(columns, "second-line")).toContain("\r\nUTC,,mA,degC,\r\n");
    expect(csvRow(row)).toBe(`${new Date(START_ms).toISOString()},4,1.5,,"a ""word"""\r\n`);
  });

  test("Parquet is read by DuckDB, value by value", async () => {
    const file = join(scratch.folder, "night.parquet");
    const parquet = new ParquetFile(file, columns);
    for (const part of rowsOf(reader, FULL, () => undefined)) await parquet.add(part);
    await parquet.close();
    const duck = await (await DuckDBInstance.create(":memory:")).connect();
    const answer = await duck.runAndReadAll(
      `SELECT epoch_ms(time) AS t, bench, session, current, sink, "judge.state" AS state
       FROM '${file}' ORDER BY time`,
    );
    const found = answer.getRowObjects();
    duck.closeSync();
    const wanted = exported(FULL).map(({ wall_ms, bench, session, cells }) => ({
      ...{ t: BigInt(wall_ms), bench, session },
      ...{ current: cells[0], sink: cells[1], state: cells[2] },
    }));
    expect(found).toHaveLength(COUNT);
    expect(found).toEqual(wanted);
  });
});
