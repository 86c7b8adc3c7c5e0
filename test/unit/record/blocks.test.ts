import { crc32 } from "node:zlib";
import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { Block, type Coded, encodeColumns, packColumns } from "../../../daemon/record/blocks.ts";
import { seeded } from "./row-maker.ts";

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

/** Counts about 2000 with noise of that many steps and a slow drift. */
function noisy(random: () => number, n: number, sigma: number): Float64Array {
  const gauss = (): number =>
    Math.sqrt(-2 * Math.log(1 - random())) * Math.cos(2 * Math.PI * random());
  return Float64Array.from({ length: n }, (_, i) => Math.round(2000 + i / 500 + sigma * gauss()));
}

type Maker = (random: () => number, n: number) => Float64Array;
const each = (n: number, of: (i: number) => number): Float64Array =>
  Float64Array.from({ length: n }, (_, i) => of(i));
const makers: Readonly<Record<string, Maker>> = {
  noise: (random, n) => noisy(random, n, 10 ** (5 * random() - 1)),
  clock: (random, n) => each(n, (i) => 1.78e12 + 10 * i + Math.round(1e5 * random()) / 1e6),
  fineClock: (random, n) =>
    each(n, (i) => 987_654.321_987 + 20 * i + Math.round(1e5 * random()) / 1e6),
  wrapping: (random, n) =>
    each(n, (i) => (4_294_900_000 + 997 * i + Math.floor(9 * random())) % 2 ** 32),
  codes: (random, n) => each(n, (i) => (i % 5 === 3 ? Math.floor(4 * random()) : i % 5)),
  table: (_, n) => each(n, (i) => Math.sin(Math.floor(i / 40))),
  wide: (random, n) => each(n, () => Math.floor((random() - 0.5) * 2 ** 33)),
  doubles: (random, n) => each(n, () => random()),
};
const longColumn = fc
  .record({
    kind: fc.constantFrom(...Object.keys(makers)),
    state: fc.nat(),
    n: fc.integer({ min: 1, max: 5000 }),
    wild: fc.array(fc.tuple(fc.nat(), value), { maxLength: 3 }),
  })
  .map(({ kind, state, n, wild }) => {
    const values = (makers[kind] as Maker)(seeded(state), n);
    for (const [at, odd] of wild) values[at % n] = odd;
    return values;
  });

const open = (coded: Coded): Block => {
  const block = Block.open(coded.codec, coded.crc, coded.blob);
  if ("fault" in block) throw new Error(block.fault);
  return block;
};

const codecs = [
  { codec: 0, encode: encodeColumns },
  { codec: 1, encode: packColumns },
];

describe.each(codecs)(`codec $codec (seed ${seed})`, ({ codec, encode }) => {
  test("gives every value back bit for bit, from any stretch of the columns", () => {
    fc.assert(
      fc.property(column, column, fc.nat(), (a, b, cut) => {
        const n = Math.min(a.length, b.length);
        const from = cut % n;
        const columns = [a, b].map((values, id) => ({
          id: id * 700,
          values: Float64Array.from(values),
        }));
        const block = open(encode(columns, from, n));
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
    const { blob, crc } = encode(columns, 0, 4);
    for (let i = 0; i < blob.length; i++) {
      const bad = blob.slice();
      bad[i] = (bad[i] as number) ^ 0x10;
      expect(Block.open(codec, crc, bad)).toHaveProperty("fault");
      expect(Block.open(codec, crc, blob.subarray(0, i))).toHaveProperty("fault");
    }
  });

  test("gives long columns of every kind back, wild values among them", () => {
    fc.assert(
      fc.property(longColumn, (values) => {
        const block = open(encode([{ id: 64, values }], 0, values.length));
        const found = block.column(64) ?? new Float64Array(0);
        expect(found.length).toBe(values.length);
        expect(found.findIndex((value, i) => !Object.is(value, values[i]))).toBe(-1);
      }),
      { seed, numRuns: 300 },
    );
  });
});

describe("what only one codec has", () => {
  test("codec 0 is as narrow as BLOCKS.md says", () => {
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
    expect(Block.open(7, crc, blob)).toEqual({
      fault: "its codec is 7; codecs up to 1 are known here",
    });
    expect(Block.open(255, crc, blob)).toEqual({ fault: "its full rate was retired" });
  });

  test("codec 1 refuses bytes that make no sense, even where the checksum is that of the bytes", () => {
    const random = seeded(seed);
    const values = noisy(random, 2000, 3);
    const { blob } = packColumns([{ id: 1, values }], 0, 2000);
    for (let i = 0; i < blob.length; i++) {
      const bad = blob.slice();
      bad[i] = (bad[i] as number) ^ (1 + Math.floor(random() * 255));
      const block = Block.open(1, crc32(bad), bad);
      // Whatever the damage: an answer of the right length or none, in bounded time.
      if (!("fault" in block)) expect([block.n, undefined]).toContain(block.column(1)?.length);
    }
  });

  test("codec 1 comes close to the noise's entropy, and clocks cost next to nothing", () => {
    const n = 6000;
    const bitsOf = (values: Float64Array): number =>
      (8 * packColumns([{ id: 1, values }], 0, n).blob.length) / n;
    for (const sigma of [0.5, 1, 2, 8, 40]) {
      // Rounding twice, of the count and of its prediction, adds 1/12 of a squared step each.
      const entropy = Math.log2(Math.sqrt((sigma ** 2 + 1 / 6) * 2 * Math.PI * Math.E));
      expect(bitsOf(noisy(seeded(7), n, sigma))).toBeLessThan(1.02 * entropy + 0.1);
    }
    const clock = Float64Array.from({ length: n }, (_, i) => 1_780_000_000_000 + 10 * i);
    expect(bitsOf(clock)).toBeLessThan(0.05);
    const wrapping = clock.map((_, i) => (4_294_900_000 + 2500 * i) % 2 ** 32);
    expect(bitsOf(wrapping)).toBeLessThan(0.05);
    const jittered = clock.map((_, i) => 5e6 + 10 * i + Math.round(1e5 * Math.sin(i * i)) / 1e6);
    expect(bitsOf(jittered)).toBeLessThan(18.5);
  });
});
