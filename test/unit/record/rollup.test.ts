import fc from "fast-check";
import { expect, test } from "vitest";
import { ROW } from "../../../daemon/model/ring.ts";
import { Block } from "../../../daemon/record/blocks.ts";
import { CHANNEL_COLUMN, NOT_KNOWN } from "../../../daemon/record/columns.ts";
import { packRolled, rollUp, SECOND_COLUMN, unrolled } from "../../../daemon/record/rollup.ts";
import { MANIFEST, START_ms } from "./row-maker.ts";

const seed = 41_007;
const HUMIDITY = 40;

interface Row {
  readonly wait_ms: number;
  readonly current: number;
  readonly humidity: number;
  readonly fresh: boolean;
  readonly asked: number;
}

const row = fc.record({
  wait_ms: fc.integer({ min: -1500, max: 1500 }),
  current: fc.integer({ min: 0, max: 4095 }),
  humidity: fc.integer({ min: 0, max: 4095 }),
  fresh: fc.boolean(),
  asked: fc.oneof(fc.integer({ min: 0, max: 200_000 }), fc.constant(NOT_KNOWN)),
});

/** Each second's statistics, plainly. */
function plainly(points: readonly { second: number; value: number }[], seconds: readonly number[]) {
  return seconds.map((second) => {
    const values = points.filter((p) => p.second === second).map((p) => p.value);
    const n = values.length;
    if (n === 0) return { n, min: 0, sum: 0, max: 0, m2: 0 };
    const sum = values.reduce((a, b) => a + b, 0);
    const m2 = values.reduce((a, v) => a + (v - sum / n) ** 2, 0);
    return { n, min: Math.min(...values), sum, max: Math.max(...values), m2 };
  });
}

test(`a second's n, min, sum, max and m2 are those of its fresh and known values (seed ${seed})`, () => {
  fc.assert(
    fc.property(fc.array(row, { minLength: 1, maxLength: 80 }), (rows) => {
      let at_ms = START_ms;
      const walls = rows.map((r) => {
        at_ms += r.wait_ms;
        return at_ms;
      });
      const columns = new Map<number, Float64Array>([
        [ROW.wall_ms, Float64Array.from(walls)],
        [ROW.freshLow, new Float64Array(rows.length).fill(0b10)],
        [ROW.freshHigh, Float64Array.from(rows, (r) => (r.fresh ? 1 << (HUMIDITY - 32) : 0))],
        [CHANNEL_COLUMN + 1, Float64Array.from(rows, (r) => r.current)],
        [CHANNEL_COLUMN + HUMIDITY, Float64Array.from(rows, (r) => r.humidity)],
        [ROW.asked_mA, Float64Array.from(rows, (r) => r.asked)],
      ]);
      const source = { n: rows.length, column: (id: number) => columns.get(id) ?? null };
      const coded = packRolled(rollUp(source, MANIFEST));
      const block = Block.open(coded.codec, coded.crc, coded.blob);
      if ("fault" in block) throw new Error(block.fault);
      const secondOf = (i: number): number => Math.floor((walls[i] as number) / 1000);
      const seconds = [...new Set(rows.map((_, i) => secondOf(i)))].sort((a, b) => a - b);
      expect([...(block.column(SECOND_COLUMN) ?? [])]).toEqual(seconds);
      const compare = (
        column: number,
        counts: (r: Row) => boolean,
        of: (r: Row) => number,
      ): void => {
        const points = rows
          .map((r, i) => ({ second: secondOf(i), value: of(r), counts: counts(r) }))
          .filter((p) => p.counts);
        plainly(points, seconds).forEach((wanted, i) => {
          const found = unrolled(block, column);
          if (found === null) {
            expect(wanted.n).toBe(0);
            return;
          }
          for (const key of ["n", "min", "sum", "max"] as const) {
            expect(found[key][i]).toBe(wanted[key]);
          }
          const spread = (m2: number): number => Math.sqrt(m2 / Math.max(1, wanted.n));
          expect(Math.abs(spread(found.m2[i] ?? Number.NaN) - spread(wanted.m2))).toBeLessThan(
            1 / 30,
          );
        });
      };
      compare(
        CHANNEL_COLUMN + 1,
        () => true,
        (r) => r.current,
      );
      compare(
        CHANNEL_COLUMN + HUMIDITY,
        (r) => r.fresh,
        (r) => r.humidity,
      );
      compare(
        ROW.asked_mA,
        (r) => r.asked !== NOT_KNOWN,
        (r) => r.asked,
      );
    }),
    { seed, numRuns: 200 },
  );
});
