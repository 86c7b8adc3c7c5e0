import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { ROW } from "../../../daemon/model/ring.ts";
import { type CsvQuery, exportCsv } from "../../../daemon/record/export.ts";
import { openReader, type RecordReader } from "../../../daemon/record/reader.ts";
import { rowMaker, START_ms } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const scratch = scratchFolder();
let reader: RecordReader;
let rows: Float64Array[];
beforeAll(() => {
  rows = recordRows(
    scratch.folder,
    rowMaker(5, (i) => i * 50),
    3000,
  );
  reader = openReader(scratch.folder);
});
afterAll(() => {
  reader.close();
  scratch.remove();
});

/** Lines of cells, read by RFC 4180's rules. */
function parse(text: string): string[][] {
  expect(text.endsWith("\r\n")).toBe(true);
  return text
    .slice(0, -2)
    .split("\r\n")
    .map((line) =>
      [...line.matchAll(/("(?:[^"]|"")*"|[^,]*)(,|$)/g)].slice(0, -1).map((m) => m[1] ?? ""),
    );
}

const csv = (query: Partial<CsvQuery>): string[][] =>
  parse([...exportCsv(reader, { units: "brackets", ...query })].join(""));

describe("CSV", () => {
  test("has every sample of a session, in units, with empty cells where nothing came", () => {
    const [head, ...lines] = csv({
      session: 1,
      channels: ["current", "sink", "judge.asked", "judge.state"],
    });
    expect(head).toEqual([
      "time [UTC]",
      "elapsed [s]",
      "tick [tick]",
      "current [mA]",
      "sink [degC]",
      "judge.asked [mA]",
      "judge.state",
    ]);
    expect(lines).toHaveLength(3000);
    expect(lines[0]?.slice(0, 2)).toEqual([new Date(START_ms).toISOString(), "0.0000"]);
    expect(lines[2999]?.[1]).toBe("149.9500");
    lines.forEach((line, i) => {
      const row = rows[i] as Float64Array;
      expect(Number(line[2])).toBe(row[ROW.tick]);
      expect(Number(line[3])).toBe((row[ROW.values + 1] as number) * 0.5);
      if (i % 2 === 0)
        expect(Number(line[4])).toBeCloseTo((row[ROW.values + 4] as number) * 0.02, 9);
      else expect(line[4]).toBe("");
      expect(line[5]).toBe(i < 5 ? "" : "1800");
      expect(line[6]).toBe("emitting");
    });
  });

  test("a window cuts to the millisecond; the last moment is not in it", () => {
    const [, ...lines] = csv({ from: START_ms + 1000, to: START_ms + 2000, channels: [] });
    expect(lines).toHaveLength(20);
    expect(lines[0]?.[0]).toBe(new Date(START_ms + 1000).toISOString());
  });

  test("units stand on a second line on request, and all channels where none are named", () => {
    const [names, units] = csv({ units: "second-line", to: START_ms + 1 });
    expect(names?.slice(0, 5)).toEqual(["time", "elapsed", "tick", "set", "current"]);
    expect(units?.slice(0, 5)).toEqual(["UTC", "s", "tick", "mA", "mA"]);
    expect(names).toContain("judge.ceiling");
  });

  test("a name with a comma or a quote is quoted", () => {
    const [head] = [...exportCsv(reader, { units: "brackets", channels: ['odd, "name"'] })];
    expect(head).toBe('time [UTC],elapsed [s],tick [tick],"odd, ""name"""\r\n');
  });
});
