import fc from "fast-check";
import { describe, expect, test } from "vitest";
import type { Row } from "../../../dashboards/now/track.ts";
import { columnsOf, timeAt, timeAxis, xAt } from "../../../dashboards/picture/columns.ts";
import { placeTags, spread, widthOf } from "../../../dashboards/picture/labels.ts";
import { layoutFor } from "../../../dashboards/picture/layout.ts";
import { bandPath, linePath, longRuns, runs } from "../../../dashboards/picture/path.ts";
import {
  caseBounds,
  corridorBounds,
  linear,
  outputBounds,
  spanFor,
} from "../../../dashboards/picture/scale.ts";

const SEED = 20261201;
const upright = (v: number): number => v;

describe("scales", () => {
  test("a straight scale hits both ends, and one point where there is no range", () => {
    const y = linear(2, 1, 0, 100);
    expect([y(2), y(1.5), y(1)]).toEqual([0, 50, 100]);
    expect(linear(3, 3, 7, 9)(3)).toBe(7);
  });

  test("the corridor's scale starts under the floor, not at zero, and holds all that it must", () => {
    const { low, high } = corridorBounds([1900, 1690], [850, 830], []);
    expect(low).toBeGreaterThan(500);
    expect(low).toBeLessThan(830);
    expect(high).toBeGreaterThan(1900);
    expect(high).toBeLessThan(2050);
  });

  test("a current under the floor pulls the scale down to it while it flows", () => {
    expect(corridorBounds([1900], [850], [200]).low).toBeLessThan(200);
  });

  test("a bench with no known floor is drawn from zero or the lowest ceiling, never upside down", () => {
    const { low, high } = corridorBounds([1900, 400], [Number.NaN], []);
    expect(low).toBeLessThan(400);
    expect(high).toBeGreaterThan(1900);
    expect(corridorBounds([], [], [])).toEqual({ low: 0, high: 1000 });
  });

  test("the trip level is always in sight; the output's scale ends above its largest", () => {
    const bounds = caseBounds([24, 25], 50);
    expect(bounds.high).toBeGreaterThan(50);
    expect(bounds.low).toBeLessThan(24);
    expect(outputBounds([300, 320, Number.NaN]).high).toBeGreaterThan(320);
    expect(outputBounds([]).high).toBeGreaterThan(0);
  });

  test("the span is the shortest that holds the record", () => {
    expect([0, 4, 6, 19, 39, 300].map((min) => spanFor(min * 60_000))).toEqual([
      2, 5, 10, 20, 40, 40,
    ]);
  });
});

describe("paths", () => {
  test("a line breaks where nothing is known", () => {
    const v = [1, 2, Number.NaN, 4, 5];
    expect(linePath({ x: [0, 1, 2, 3, 4], v }, upright)).toBe("M0 1L1 2M3 4L4 5");
  });

  test("values under the scale run along its foot", () => {
    expect(linePath({ x: [0, 1], v: [0, 9] }, upright, 5)).toBe("M0 5L1 9");
  });

  test("a band is one closed piece for each known stretch", () => {
    const d = bandPath([0, 1, 2, 3], [9, 9, Number.NaN, 9], [1, 1, 1, 1], upright);
    expect(d).toBe("M0 9L1 9L1 1L0 1ZM3 9L3 1Z");
  });

  test("runs of one answer; short ones join the one before", () => {
    const codes = [2, 2, 2, 0, 2, 0, 0, 0];
    const all = runs(codes.length, (i) => codes[i]);
    expect(all.map((r) => [r.from, r.to, r.is])).toEqual([
      [0, 3, 2],
      [3, 4, 0],
      [4, 5, 2],
      [5, 8, 0],
    ]);
    expect(longRuns(all, 2).map((r) => [r.from, r.to, r.is])).toEqual([
      [0, 5, 2],
      [5, 8, 0],
    ]);
    expect(runs(3, (i) => (i === 1 ? undefined : "a")).length).toBe(2);
  });
});

const row = (t: number, current: number): Row => ({
  t,
  current,
  ceiling: 1900,
  floor: 800,
  maker: 2,
  asked: 1800,
  output: 300,
  expected: 300,
  degC: 30,
  state: 3,
});

describe("time", () => {
  test("the now line stands at the right edge of the past, and pixels read back as times", () => {
    const axis = timeAxis(2_400_000, 40, 1000);
    expect(xAt(axis, axis.now)).toBe(1000);
    expect(timeAt(axis, xAt(axis, 1_234_567))).toBeCloseTo(1_234_567, 3);
  });

  test("columns slide by whole pixels: the same second keeps its column's neighbours", () => {
    const rows = Array.from({ length: 100 }, (_, i) => row(i * 1000, i));
    const a = columnsOf(rows, timeAxis(100_000, 2, 60));
    const b = columnsOf(rows, timeAxis(102_000, 2, 60));
    const shift = (a.x[5] ?? 0) - (b.x[b.t.indexOf(a.t[5] ?? 0)] ?? 0);
    expect(shift).toBe(1);
    expect(a.x.every(Number.isInteger)).toBe(true);
  });

  test("a row in which nothing is known survives thinning", () => {
    const nothing = { ...row(5500, Number.NaN), ceiling: Number.NaN, degC: Number.NaN };
    const rows = [row(5000, 1), nothing, row(9000, 2)];
    const columns = columnsOf(rows, timeAxis(20_000, 2, 12));
    expect(columns.ceiling.some(Number.isNaN)).toBe(true);
  });
});

describe(`placing words (seed ${SEED})`, () => {
  const heights = fc.array(fc.double({ min: 0, max: 300, noNaN: true }), { maxLength: 6 });

  test("labels keep their order and never lie on one another", () => {
    fc.assert(
      fc.property(heights, (ys) => {
        const sorted = [...ys].sort((a, b) => a - b);
        const out = spread(sorted, 16, 400);
        for (let i = 1; i < out.length; i++) {
          expect((out[i] ?? 0) - (out[i - 1] ?? 0)).toBeGreaterThanOrEqual(16 - 1e-9);
        }
        expect(out.every((y) => y <= 400)).toBe(true);
      }),
      { seed: SEED },
    );
  });

  test("labels that have room stay where they are", () => {
    expect(spread([10, 60, 200], 16, 400)).toEqual([10, 60, 200]);
  });

  const tags = fc.array(
    fc.record({
      x: fc.double({ min: -50, max: 900, noNaN: true }),
      text: fc.string({ minLength: 1, maxLength: 18 }),
      rank: fc.nat(4),
    }),
    { maxLength: 30 },
  );

  test("words under the axis never overlap, and stay within", () => {
    fc.assert(
      fc.property(tags, (given) => {
        const placed = placeTags(given, 12.5, { from: 40, to: 800, rows: 2 });
        for (const a of placed) {
          const width = widthOf(given[a.index]?.text ?? "", 12.5);
          expect(a.left).toBeGreaterThanOrEqual(40);
          expect(a.left + width).toBeLessThanOrEqual(800 + 1e-9);
          for (const b of placed) {
            if (a === b || a.row !== b.row || b.left < a.left) continue;
            expect(b.left).toBeGreaterThanOrEqual(a.left + width);
          }
        }
      }),
      { seed: SEED },
    );
  });

  test("a trip pushes plain times out, never the other way round", () => {
    const given = [
      { x: 100, text: "23:40", rank: 1, rows: 1 },
      { x: 102, text: "23:39 trip", rank: 4 },
    ];
    const placed = placeTags(given, 12.5, { from: 0, to: 300, rows: 2 });
    expect(placed.map((p) => p.index)).toEqual([1]);
  });
});

test.each([320, 380, 719, 720, 1280, 1799, 1800, 2560])(
  "at %i px everything stands in order from left to right and from top to bottom",
  (width) => {
    const l = layoutFor(width, 800);
    const across = [0, l.g0, l.g1, width];
    const down = [l.top, l.corridor, ...l.output, ...l.case, l.words, l.height];
    expect([...across].sort((a, b) => a - b)).toEqual(across);
    expect([...down].sort((a, b) => a - b)).toEqual(down);
    expect(l.g0).toBeGreaterThan(100);
  },
);
