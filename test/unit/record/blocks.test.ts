import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { Block, encodeColumns } from "../../../daemon/record/blocks.ts";

const seed = 20_261_201;

const value = fc.oneof(
  fc.integer(),
  fc.integer({ min: 0, max: 4095 }),
  fc.maxSafeInteger(),
  fc.double(),
  fc.constantFrom(Number.NaN, -0, 0, Number.POSITIVE_INFINITY, -(2 ** 31), 2 ** 32, 2 ** 32 - 1),
);
const column = fc.oneof(
  fc.array(value, { minLength: 1, maxLength: 40 }),
  fc.array(fc.integer({ min: -300, max: 300 }), { minLength: 1, maxLength: 40 }),
  fc.array(fc.integer({ min: 0, max: 200_000 }), { minLength: 1, maxLength: 40 }),
  fc.tuple(value, fc.nat(40)).map(([v, n]) => new Array<number>(n + 1).fill(v)),
);

const open = (coded: { blob: Uint8Array; crc: number }): Block => {
  const block = Block.open(0, coded.crc, coded.blob);
  if ("fault" in block) throw new Error(block.fault);
  return block;
};

describe(`codec 0 (seed ${seed})`, () => {
  test("gives every value back bit for bit, from any stretch of the columns", () => {
    fc.assert(
      fc.property(column, column, fc.nat(), (a, b, cut) => {
        const n = Math.min(a.length, b.length);
        const from = cut % n;
        const columns = [a, b].map((values, id) => ({
          id: id * 700,
          values: Float64Array.from(values),
        }));
        const block = open(encodeColumns(columns, from, n));
        expect(block.n).toBe(n - from);
        expect(block.ids).toEqual([0, 700]);
        for (const { id, values } of columns) {
          expect([...(block.column(id) ?? [])]).toEqual([...values.subarray(from, n)]);
        }
      }),
      { seed, numRuns: 500 },
    );
  });

  test("any changed byte and any shortening is noticed", () => {
    const columns = [{ id: 1, values: Float64Array.from([1, 2, 3, 70_000]) }];
    const { blob, crc } = encodeColumns(columns, 0, 4);
    for (let i = 0; i < blob.length; i++) {
      const bad = blob.slice();
      bad[i] = (bad[i] as number) ^ 0x10;
      expect(Block.open(0, crc, bad)).toHaveProperty("fault");
      expect(Block.open(0, crc, blob.subarray(0, i))).toHaveProperty("fault");
    }
  });

  test("is as narrow as BLOCKS.md says", () => {
    const sizeOf = (values: number[]): number =>
      encodeColumns([{ id: 1, values: Float64Array.from(values) }], 0, values.length).blob.length -
      24;
    expect(sizeOf([5, 5, 5])).toBe(0);
    expect(sizeOf([1000, 1255, 1000])).toBe(3);
    expect(sizeOf([1000, 1256, 1000])).toBe(6);
    expect(sizeOf([0, 65_536, 1])).toBe(12);
    expect(sizeOf([0, 2 ** 32, 1])).toBe(24);
    expect(sizeOf([0.5, 1, 2])).toBe(24);
  });

  test("a codec from a newer program is refused by number", () => {
    const { blob, crc } = encodeColumns([], 0, 0);
    expect(Block.open(7, crc, blob)).toEqual({ fault: "its codec is 7; codec 0 is known here" });
  });
});
