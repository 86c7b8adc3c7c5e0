import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { Block, encodeColumns } from "../../../daemon/record/blocks.ts";
import { lineOf, real, text, whole } from "../../../daemon/record/influx-points.ts";
import { Stamps, stampText } from "../../../daemon/record/influx-stamps.ts";
import { joined, textPoints } from "../../../daemon/record/influx-texts.ts";
import { MANIFEST } from "./row-maker.ts";

const seed = 3_907;

describe("lines of the protocol", () => {
  test("are as InfluxData's page describes them", () => {
    const point = {
      measurement: "beamsitter_samples",
      tags: { bench: "north", session: "4" },
      fields: { "judge.ceiling": whole(190_012), case: whole(-3), ratio: real(0.25) },
      timestamp: "1780000000000000001",
    };
    expect(lineOf(point)).toBe(
      "beamsitter_samples,bench=north,session=4 case=-3i,judge.ceiling=190012i,ratio=0.25 1780000000000000001",
    );
  });
  test("names with spaces, commas and equal signs, and texts with quotes, stay themselves", () => {
    const tags = { bench: "a b,c=d" };
    const point = {
      measurement: "m n,o",
      tags,
      fields: { "x y": text('say "\\n"') },
      timestamp: "1",
    };
    expect(lineOf(point)).toBe('m\\ n\\,o,bench=a\\ b\\,c\\=d x\\ y="say \\"\\\\n\\"" 1');
  });
});

describe(`stamps (seed ${seed})`, () => {
  const walls = fc.array(fc.integer({ min: -3, max: 5 }), { minLength: 1, maxLength: 200 });

  test("are unique by session and clock, however the clock goes, and follow from the record", () => {
    fc.assert(
      fc.property(
        walls,
        fc.constantFrom<"n" | "ms">("n", "ms"),
        fc.nat(200),
        (moves, unit, cut) => {
          let now = 1_780_000_000_000;
          const at = moves.map((move) => (now += move));
          const stamps = new Stamps(unit);
          let resumed = new Stamps(unit);
          const seen = new Set<string>();
          at.forEach((wall, i) => {
            const { stamp, clock } = stamps.next(wall, 1);
            seen.add(`${clock} ${stamp}`);
            if (i === cut) resumed = new Stamps(unit, JSON.parse(JSON.stringify(resumed.state)));
            expect(resumed.next(wall, 1)).toEqual({ stamp, clock });
          });
          expect(seen.size).toBe(at.length);
        },
      ),
      { seed },
    );
  });
  test("in nanoseconds stand less than a microsecond after their own time", () => {
    const stamps = new Stamps("n");
    const given = [5, 5, 5, 6, 6.25, 5].map((wall) => stamps.next(wall, 1));
    expect(given.map((g) => g.stamp)).toEqual([
      "5000000",
      "5000001",
      "5000002",
      "6000000",
      "6250000",
      "5000000",
    ]);
    expect(given.map((g) => g.clock)).toEqual([0, 0, 0, 0, 0, 1]);
    expect(stampText(1_780_000_000_000, 1)).toBe("1780000000000000001");
  });
  test("in milliseconds are the next free one", () => {
    const stamps = new Stamps("ms");
    expect([5, 5, 5, 6, 20].map((wall) => stamps.next(wall, 1).stamp)).toEqual([
      "5",
      "6",
      "7",
      "8",
      "20",
    ]);
  });
});

describe("texts in pieces", () => {
  test("come back as they were, and not at all where a piece is missing", () => {
    const coded = encodeColumns([], 0, 0);
    const block = Block.open(0, coded.crc, coded.blob);
    if ("fault" in block) throw new Error(block.fault);
    const bench = `title: "\\'" # ${"ü\n".repeat(30_000)}`;
    const [point] = textPoints(
      { bench: "north", session: 1, manifest: MANIFEST, block },
      bench,
      "1",
    );
    const fields = new Map(
      Object.entries(point?.fields ?? {}).map(([name, field]) => {
        const written = field.toString();
        expect(Buffer.byteLength(written)).toBeLessThan(65_000);
        expect(written).not.toContain("\n");
        return [name, written.slice(1, -1).replaceAll(/\\(["\\])/g, "$1")];
      }),
    );
    expect(joined("bench-file", fields)).toBe(bench);
    expect(JSON.parse(joined("manifest", fields) ?? "")).toEqual(MANIFEST);
    fields.delete("bench-file.1");
    expect(joined("bench-file", fields)).toBeNull();
  });
});
