import fc from "fast-check";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { ROW } from "../../../daemon/model/ring.ts";
import type { SeriesAnswer, SeriesTrace } from "../../../daemon/model/series.ts";
import { wall } from "../../../daemon/model/times.ts";
import { type Converter, openReader, type RecordReader } from "../../../daemon/record/reader.ts";
import { gapAfter_ms } from "../../../daemon/record/recorder.ts";
import { MANIFEST, rowMaker, START_ms, seeded } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const seed = 7_041;
const COUNT = 9000;

/** 20 samples a second with jitter, a gap of 5 s, one of 4 min, and a clock put back by 40 s. */
function times(): (i: number) => number {
  const random = seeded(3);
  const at = new Float64Array(COUNT);
  let now = 0;
  for (let i = 0; i < COUNT; i++) {
    now += 45 + random() * 10;
    if (i === 2000) now += 5000;
    if (i === 5000) now += 240_000;
    at[i] = now;
  }
  return (i) => at[i] as number;
}

interface Point {
  readonly t: number;
  readonly value: number;
}

/** A falling conversion for the case, as a thermistor's: the least count is the warmest. */
const convert: Converter = (channel, counts) =>
  channel.name === "case" ? 100 - 0.02 * counts : counts * channel.perCount;

const scratch = scratchFolder();
let reader: RecordReader;
const points = new Map<string, Point[]>();
const all: number[] = [];

beforeAll(() => {
  const at = times();
  const make = rowMaker(11, at);
  const rows = recordRows(
    scratch.folder,
    (i) => {
      const row = make(i);
      if (i >= 7000) row[ROW.wall_ms] = (row[ROW.wall_ms] as number) - 40_000;
      return row;
    },
    COUNT,
  );
  for (const row of rows) {
    const t = row[ROW.wall_ms] as number;
    all.push(t);
    for (const channel of MANIFEST.channels) {
      const bits = row[channel.index < 32 ? ROW.freshLow : ROW.freshHigh] as number;
      if ((bits & (1 << (channel.index & 31))) === 0) continue;
      note(channel.name, t, convert(channel, row[ROW.values + channel.index] as number));
    }
    const asked = row[ROW.asked_mA] as number;
    if (!Number.isNaN(asked)) note("judge.asked", t, asked);
    note("judge.ceiling", t, Math.round((row[ROW.ceiling_mA] as number) * 100) / 100);
    const delay = row[ROW.ackAge_ticks] as number;
    if (delay >= 0) note("link.loopDelay", t, delay);
  }
  all.sort((a, b) => a - b);
  reader = openReader(scratch.folder, convert);
});
afterAll(() => {
  reader.close();
  scratch.remove();
});

function note(name: string, t: number, value: number): void {
  const list = points.get(name) ?? [];
  list.push({ t, value });
  points.set(name, list);
}

const CHANNELS = [
  "current",
  "case",
  "sink",
  "humidity",
  "judge.asked",
  "judge.ceiling",
  "link.loopDelay",
];

const ask = (from: number, to: number, pixels: number): Promise<SeriesAnswer> =>
  reader.series({
    bench: "north",
    channels: [...CHANNELS, "no-such", "judge.expected"],
    window: { from: wall(from), to: wall(to) },
    pixels,
  });

/** What the answer must be, from every sample there ever was. */
function bruteTrace(list: readonly Point[], from: number, to: number, step_ms: number) {
  const groups = new Map<number, Point[]>();
  const first = Math.floor(from / step_ms);
  const end = Math.max(first, Math.ceil(to / step_ms));
  for (const p of list) {
    const at = step_ms === 0 ? p.t : Math.floor(p.t / step_ms);
    if (step_ms === 0 ? p.t < from || p.t >= to : at < first || at >= end) continue;
    groups.set(at, [...(groups.get(at) ?? []), p]);
  }
  return [...groups]
    .sort(([a], [b]) => a - b)
    .map(([at, group]) => ({
      t: step_ms === 0 ? at : (at + 0.5) * step_ms,
      min: Math.min(...group.map((p) => p.value)),
      mean: group.reduce((sum, p) => sum + p.value, 0) / group.length,
      max: Math.max(...group.map((p) => p.value)),
      n: group.length,
    }));
}

function expectTrace(trace: SeriesTrace | undefined, brute: ReturnType<typeof bruteTrace>): void {
  if (trace === undefined) throw new Error("the trace is missing");
  expect([...trace.t]).toEqual(brute.map((b) => b.t));
  expect([...trace.n]).toEqual(brute.map((b) => b.n));
  const close = (found: Float64Array, wanted: number[]): void =>
    found.forEach((value, i) => {
      expect(Math.abs(value - (wanted[i] as number))).toBeLessThan(1e-6);
    });
  close(
    trace.min,
    brute.map((b) => b.min),
  );
  close(
    trace.mean,
    brute.map((b) => b.mean),
  );
  close(
    trace.max,
    brute.map((b) => b.max),
  );
}

function bruteGaps(from: number, to: number) {
  const longest = gapAfter_ms(MANIFEST.rate_perS);
  const gaps: { from: number; to: number }[] = [];
  const first = all[0] as number;
  const last = all[all.length - 1] as number;
  if (first > from) gaps.push({ from, to: Math.min(first, to) });
  for (let i = 1; i < all.length; i++) {
    const [a, b] = [all[i - 1] as number, all[i] as number];
    if (b - a > longest && b > from && a < to) {
      gaps.push({ from: Math.max(a, from), to: Math.min(b, to) });
    }
  }
  if (to - last > 2500) gaps.push({ from: Math.max(last, from), to });
  return gaps;
}

async function expectEqualToBrute(from: number, to: number, pixels: number): Promise<number> {
  const answer = await ask(from, to, pixels);
  for (const name of CHANNELS) {
    expectTrace(
      answer.channels[name],
      bruteTrace(points.get(name) ?? [], from, to, answer.step_ms),
    );
  }
  expect(answer.channels["no-such"]?.t).toHaveLength(0);
  expect(answer.channels["judge.expected"]?.t).toHaveLength(0);
  expect(answer.gaps).toEqual(bruteGaps(from, to));
  return answer.step_ms;
}

describe("series against every sample, one by one", () => {
  test.each([
    ["the whole night from rollups", -60_000, 800_000, 200, 5000],
    ["ten seconds and more a pixel", -60_000, 800_000, 50, 20_000],
    ["just ten seconds a pixel", 100_000, 600_000, 50, 10_000],
    ["a pixel of half an hour", -60_000, 7_200_000, 4, 3_600_000],
    ["two hours a pixel", -90_000_000, 90_000_000, 25, 7_200_000],
    ["a pixel of just a second", 0, 300_000, 300, 1000],
    ["under a second a pixel", 0, 100_000, 500, 200],
    ["single samples", 90_000, 92_000, 1000, 0],
    ["only the long gap", 400_000, 420_000, 100, 0],
    ["before anything", -100_000, -50_000, 10, 5000],
    ["after everything", 900_000, 990_000, 10, 9000],
    ["over the clock that was put back", 540_000, 620_000, 2000, 0],
  ])("%s", async (_name, from, to, pixels, step_ms) => {
    expect(await expectEqualToBrute(START_ms + from, START_ms + to, pixels)).toBe(step_ms);
  });

  test(`any window at any width (seed ${seed})`, async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.integer({ min: -20_000, max: 720_000 }),
        fc.integer({ min: 1, max: 300_000 }),
        fc.integer({ min: 1, max: 400 }),
        async (from, length, pixels) => {
          await expectEqualToBrute(START_ms + from, START_ms + from + length, pixels);
        },
      ),
      { seed, numRuns: 25 },
    );
  });

  test("an aborted question rejects with its reason", async () => {
    const stop = new AbortController();
    const asked = reader.series(
      {
        bench: "north",
        channels: ["case"],
        window: { from: wall(0), to: wall(START_ms * 2) },
        pixels: 9,
      },
      stop.signal,
    );
    stop.abort(new Error("the page is gone"));
    await expect(asked).rejects.toThrow("the page is gone");
  });

  test("another bench has nothing, and all of its window is a gap", async () => {
    const window = { from: wall(START_ms), to: wall(START_ms + 1000) };
    const answer = await reader.series({ bench: "south", channels: ["case"], window, pixels: 10 });
    expect(answer.channels.case?.n).toHaveLength(0);
    expect(answer.gaps).toEqual([window]);
  });

  test("channels are the controller's, then those made here", () => {
    const names = reader.channels().map((c) => c.name);
    expect(names.slice(0, 6)).toEqual(MANIFEST.channels.map((c) => c.name));
    expect(names).toContain("judge.ceiling");
  });
});
