import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import fc from "fast-check";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { exportCsv } from "../../../daemon/record/export.ts";
import { ParquetFile } from "../../../daemon/record/export-parquet.ts";
import { columnsOf, type RowsQuery, rowsOf } from "../../../daemon/record/export-rows.ts";
import { type Imported, importFile } from "../../../daemon/record/import.ts";
import { CsvCutter } from "../../../daemon/record/import-source.ts";
import { Times } from "../../../daemon/record/import-times.ts";
import { openReader, type RecordReader } from "../../../daemon/record/reader.ts";
import { verify } from "../../../daemon/record/verify.ts";
import { rowMaker, START_ms } from "./row-maker.ts";
import { recordRows } from "./synthetic.ts";

const seed = 20261201;
const root = mkdtempSync(join(tmpdir(), "beamsitter-import-test-"));
afterAll(() => rmSync(root, { recursive: true, force: true }));

let files = 0;
interface Ask {
  readonly map?: string;
  readonly zone?: string;
  readonly start_ms?: number;
}

async function imported(text: string, ask: Ask = {}) {
  const file = join(root, `${++files}.csv`);
  writeFileSync(file, text);
  return importedFile(file, ask);
}

async function importedFile(
  file: string,
  { map, zone = "UTC", start_ms }: Ask,
): Promise<Imported & { folder: string }> {
  const folder = join(root, `record-${++files}`);
  const found = await importFile(
    { file, map, times: { zone, start_ms: start_ms ?? null }, bench: "north" },
    folder,
    () => undefined,
    new AbortController().signal,
  );
  return { ...found, folder };
}

async function everyValue(reader: RecordReader, channel: string): Promise<[number, number][]> {
  const [session] = reader.sessions();
  if (session === undefined) return [];
  const window = { from: session.started, to: wall(session.last + 1) };
  const query = { bench: "north", channels: [channel], window, pixels: 5000 };
  const { channels, step_ms } = await reader.series(query);
  expect(step_ms).toBe(0);
  const trace = channels[channel];
  return [...(trace?.t ?? [])].map((t, i) => [t, trace?.mean[i] as number]);
}

/** Every value of an imported channel, with its time. */
async function valuesOf(folder: string, channel: string): Promise<[number, number][]> {
  // A conversion of some bench file: it may not touch what is in units already.
  const reader = openReader(folder, () => -1);
  const found = await everyValue(reader, channel);
  reader.close();
  return found;
}

describe("an old logger's file", () => {
  const OLD = [
    "Stamp;I set (A);T;Note",
    "2026-12-01 22:00:00;1,80;25,1;x",
    '2026-12-01 22:00:10;1,8105;;"a ""b"" ; c"',
    "2026-12-01 22:00:20;abc;25,3;",
    "2026-12-01 22:00:05;1,8;25,3;",
    "2026-02-31 22:00:00;1,8;25,3;",
    "2026-12-01 22:00:30;1,8",
    "yesterday;1,8;25,3;",
    '2026-12-01 22:00:40;1,82;25,35;"two',
    'lines"',
    "2026-12-01 22:30:00;-0,5;25,4;",
    "",
  ].join("\r\n");
  const map = "time=Stamp, current=I set (A)[A], case=#3[°C]";

  test("gives its values in the units of the record; bad rows are named by line", async () => {
    const found = await imported(OLD, { map });
    expect(found.bad.map(({ line, why }) => `${line}: ${why}`)).toEqual([
      '4: its current is "abc"',
      "5: its time is not later than that of the row before",
      '6: "2026-02-31 22:00:00" is no day or hour that there is',
      "7: it has 2 cells, the first line 4",
      '8: "yesterday" is no time like 2026-12-01 22:00:00',
    ]);
    expect(found).toMatchObject({ rows: 4, badRows: 5 });
    const t = Date.UTC(2026, 11, 1, 22);
    expect(await valuesOf(found.folder, "current")).toEqual([
      [t, 1800],
      [t + 10_000, 1810.5],
      [t + 40_000, 1820],
      [t + 1_800_000, -500],
    ]);
    const cases = (await valuesOf(found.folder, "case")).map(([, value]) => value.toFixed(9));
    expect(cases).toEqual([25.1, 25.35, 25.4].map((value) => value.toFixed(9)));
  });

  test("is a session of kind watched, with its gap, that every check finds sound", async () => {
    const { folder } = await imported(OLD, { map });
    const reader = openReader(folder);
    expect(reader.sessions()).toMatchObject([{ kind: "watched", samples: 4, bench: "north" }]);
    expect(reader.events({ from: wall(0), to: wall(4e12) })[0]?.data.words).toMatch(
      /^Imported from \d+\.csv: 4 rows; 5 rows could not be used\.$/,
    );
    const work = verify(reader.parts().db);
    let step = work.next();
    while (step.done !== true) step = work.next();
    expect(step.value).toMatchObject({ gaps: 1, faults: [] });
    reader.close();
  });

  test.each([
    ["no time", "a,b\n1,2\n", undefined, /Nothing says which column is the time.*a, b/],
    ["no unit", "t,b\n1,2\n", "time=t[s],current=b", /in which unit current is.*current=b\[mA\]/],
    ["no such column", "t,b\n1,2\n", "time=t,current=c[A]", /no column "c".*There are t, b/],
    ["no start", "t,b\n1,2\n2,3\n", "time=t[s],current=b[A]", /--start must name; 2 rows/],
    ["the record's own name", "t,b\n1,2\n", "time=t,judge.aim=b[A]", /the record's own/],
    ["a channel twice", "t,b\n1,2\n", "time=t,x=b[A],x=b[A]", /x stands twice/],
    ["no columns", "just words\n", undefined, /has no columns/],
    ["nothing", "", undefined, /has no columns/],
  ])("%s: refused with what to write", async (_name, text, map_, words) => {
    await expect(imported(text, map_ === undefined ? {} : { map: map_ })).rejects.toThrow(words);
  });

  test("plain numbers count from --start, or from 1970 where they are that large", async () => {
    const ask = { map: "time=t[s],current=b[mA]" };
    const counted = await imported("t,b\n0.5,1\n1,2\n", { ...ask, start_ms: START_ms });
    expect(counted.from_ms).toBe(START_ms + 500);
    const large = await imported(`t,b\n${START_ms / 1000},1\n${START_ms / 1000 + 1},2\n`, ask);
    expect(large.from_ms).toBe(START_ms);
  });
});

describe("stamps in a zone", () => {
  const times = new Times({ zone: "Europe/Berlin", start_ms: null, unit: "" });

  test("winter and summer, an hour that came twice, and one that never came", () => {
    const utc = (text: string): number => Date.parse(text);
    expect(times.read("2026-01-10 12:00")).toEqual({ at: [utc("2026-01-10T11:00Z")] });
    expect(times.read("10.07.2026 12:00:00,5")).toEqual({ at: [utc("2026-07-10T10:00:00.500Z")] });
    expect(times.read("2026-10-25T02:30:00")).toEqual({
      at: [utc("2026-10-25T00:30Z"), utc("2026-10-25T01:30Z")],
    });
    expect(times.read("2026-03-29 02:30:00")).toEqual({
      bad: '"2026-03-29 02:30:00" was left out by the clocks of that zone',
    });
    expect(times.read("2026-10-25T02:30:00+01:00")).toEqual({ at: [utc("2026-10-25T01:30Z")] });
  });

  test("a zone that is none, and none at all", () => {
    expect(() => new Times({ zone: "Mars/Base", start_ms: null, unit: "" })).toThrow(
      /no time zone/,
    );
    const none = new Times({ zone: null, start_ms: null, unit: "" });
    expect(none.read("2026-01-10 12:00")).toMatchObject({ bad: expect.stringMatching(/--zone/) });
  });
});

describe(`CSV cut anywhere (seed ${seed})`, () => {
  test("reads the same", () => {
    const cell = fc.string({ unit: fc.constantFrom("a", "1", ",", '"', "\n", "\r", " ") });
    const row = fc.array(cell, { minLength: 2, maxLength: 4 });
    fc.assert(
      fc.property(fc.array(row, { minLength: 1 }), fc.infiniteStream(fc.nat(7)), (rows, cuts) => {
        const text = rows
          .map((cells) => cells.map((c) => `"${c.replaceAll('"', '""')}"`).join(","))
          .join("\r\n");
        const cutter = new CsvCutter(",");
        const found = [];
        for (let at = 0; at < text.length; ) {
          const n = 1 + (cuts.next().value ?? 0);
          found.push(...cutter.push(text.slice(at, at + n)));
          at += n;
        }
        found.push(...cutter.end());
        expect(found.map((r) => r.cells)).toEqual(rows);
      }),
      { seed },
    );
  });
});

describe("our own exports come back", () => {
  const folder = join(root, "native");
  const channels = [
    { name: "current", unit: "mA" },
    { name: "case", unit: "degC" },
    { name: "photodiode", unit: "mW" },
  ];
  let native: [number, number][];
  beforeAll(async () => {
    const make = rowMaker(8, (i) => i * 50);
    recordRows(folder, make, 1500);
    const reader = openReader(folder);
    native = await everyValue(reader, "current");
    reader.close();
  });

  test("from CSV, without a map", async () => {
    const reader = openReader(folder);
    const text = [...exportCsv(reader, { units: "brackets" })].join("");
    reader.close();
    const found = await imported(text);
    expect(found).toMatchObject({ rows: 1500, badRows: 0, rate_perS: 20 });
    expect(await valuesOf(found.folder, "current")).toEqual(native);
  });

  test("from Parquet, with one", async () => {
    const reader = openReader(folder);
    const query: RowsQuery = { channels, rate: { kind: "full" } };
    const file = join(root, "native.parquet");
    const parquet = new ParquetFile(file, columnsOf(query));
    for (const rows of rowsOf(reader, query, () => undefined)) await parquet.add(rows);
    await parquet.close();
    reader.close();
    const map = "time=time,current=current[mA],case=case[degC],photodiode=photodiode[mW]";
    const found = await importedFile(file, { map });
    expect(found).toMatchObject({ rows: 1500, badRows: 0 });
    expect(await valuesOf(found.folder, "current")).toEqual(native);
  });
});
