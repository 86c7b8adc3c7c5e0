import { afterEach, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { keep } from "../../../daemon/record/keeper-client.ts";
import { RecordProblem } from "../../../daemon/record/problem.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { scratchFolder } from "./synthetic.ts";

let scratch = scratchFolder();
afterEach(() => {
  scratch.remove();
  scratch = scratchFolder();
});

const KEEPING = { progress: () => {}, signal: new AbortController().signal };
const EPOCH = {
  verb: "epoch",
  bench: "north",
  part: "diode",
  wall_ms: 2000,
  serial: "D-17",
  note: "the old one had faded",
  who: "lab",
  values: { threshold: "0.42 A" },
} as const;
const READING = {
  verb: "reading",
  bench: "north",
  name: "meter",
  wall_ms: 1000,
  value: 1830,
  unit: "mW",
  typed: false,
  note: "",
  who: "",
} as const;
const ALL = { from: wall(0), to: wall(1e15) };

describe("a change by hand", () => {
  test("is kept without a daemon, listed, and an event on the time axis", async () => {
    const done = await keep(scratch.folder, EPOCH, KEEPING);
    expect(done.words).toContain("Another diode, serial D-17, threshold 0.42 A");
    const reader = openReader(scratch.folder);
    const { verb: _verb, wall_ms, ...facts } = EPOCH;
    expect(reader.epochs("north")).toEqual([{ id: 1, at: wall_ms, ...facts }]);
    expect(reader.epochs("south")).toEqual([]);
    const [event] = reader.events(ALL);
    expect(event).toMatchObject({ kind: "epoch", wall: 2000, bench: "north" });
    expect(event?.data.words).toBe(
      "Another diode, serial D-17, threshold 0.42 A: the old one had faded.",
    );
    expect(event?.id).toBeLessThan(0);
    expect(reader.events({ from: wall(2001), to: wall(3000) })).toEqual([]);
    reader.close();
  });
  test("with a text beyond all measure is refused", async () => {
    const long = { ...EPOCH, note: "x".repeat(501) };
    await expect(keep(scratch.folder, long, KEEPING)).rejects.toThrow(RecordProblem);
    const reader = openReader(scratch.folder);
    expect(reader.epochs()).toEqual([]);
    reader.close();
  });
});

describe("readings of a witness", () => {
  test("are a channel of their own; of the typed ones each is an event", async () => {
    await keep(scratch.folder, READING, KEEPING);
    await keep(scratch.folder, { ...READING, wall_ms: 1500, value: 1840 }, KEEPING);
    const typed = { ...READING, name: "typed", typed: true, who: "lab", wall_ms: 3000 };
    await keep(scratch.folder, typed, KEEPING);
    const reader = openReader(scratch.folder);
    const series = async (channel: string, pixels: number) =>
      (
        await reader.series({
          bench: "north",
          channels: [channel],
          window: { from: wall(0), to: wall(10_000) },
          pixels,
        })
      ).channels[channel];
    expect([...((await series("witness.meter", 100))?.mean ?? [])]).toEqual([1830, 1840]);
    const rolled = await series("witness.meter", 2);
    expect([rolled?.n[0], rolled?.min[0], rolled?.mean[0], rolled?.max[0]]).toEqual([
      2, 1830, 1835, 1840,
    ]);
    expect([...((await series("witness.typed", 100))?.mean ?? [])]).toEqual([1830]);
    expect([...((await series("meter", 100))?.mean ?? [])]).toEqual([]);
    expect(reader.events(ALL).map((event) => event.data.words)).toEqual(["lab read 1830 mW."]);
    await keep(scratch.folder, EPOCH, KEEPING);
    const ids = reader.events(ALL).map((event) => event.id);
    expect(new Set(ids).size).toBe(2);
    expect(ids.every((id) => id < 0)).toBe(true);
    expect(reader.readings().map(({ name }) => name)).toEqual(["meter", "meter", "typed"]);
    reader.close();
  });
  test("a reading that is no number is refused", async () => {
    const none = { ...READING, value: Number.NaN };
    await expect(keep(scratch.folder, none, KEEPING)).rejects.toThrow("A reading is a number");
  });
});
