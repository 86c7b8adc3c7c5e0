import { afterEach, describe, expect, test } from "vitest";
import { Ring, ROW, ringBytes } from "../../../daemon/model/ring.ts";
import { wall } from "../../../daemon/model/times.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { MANIFEST, publish, rowMaker, START_ms } from "./row-maker.ts";
import { event, recording, recordRows, scratchFolder } from "./synthetic.ts";

let scratch = scratchFolder();
afterEach(() => {
  scratch.remove();
  scratch = scratchFolder();
});
const every50ms = (i: number): number => i * 50;

describe("what goes in comes out", () => {
  test("inputs come back in order and bit for bit, journal between samples", () => {
    const { folder } = scratch;
    const { ring, recorder } = recording(folder, 8000);
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
    const make = rowMaker(1, every50ms);
    const expected: { n: number; now_ms: number; kind: number }[] = [];
    const rows = new Map<number, Float64Array>();
    let input = 0;
    for (let i = 0; i < 7000; i++) {
      if (i % 500 === 3) {
        input++;
        const entry = { input, kind: 1, now_ms: i + 0.3, request: 1, asker: 2, requestId: i };
        recorder.take({
          kind: "journal",
          entry: { ...entry, value: 0.1 + i, fact: 0, factValue: 0 },
        });
        expected.push({ n: input, now_ms: i + 0.3, kind: 1 });
      }
      const row = make(i);
      row[ROW.input] = ++input;
      rows.set(input, row);
      expected.push({ n: input, now_ms: row[ROW.mono_ms] as number, kind: 0 });
      publish(ring, row);
      if (i % 1000 === 0) recorder.drain();
    }
    recorder.close();
    const reader = openReader(folder);
    const found: typeof expected = [];
    for (const got of reader.inputs(1)) {
      found.push({ n: got.n, now_ms: got.now_ms, kind: got.kind });
      if (got.kind === 1) {
        expect(got.value).toBe(0.1 + got.requestId);
        continue;
      }
      const row = rows.get(got.n) as Float64Array;
      expect(got.drift).toBe(row[ROW.drift]);
      expect(got.jump_ms).toBe(row[ROW.jump_ms]);
      expect(got.newest + 2 * got.portDrained).toBe(row[ROW.gate]);
      expect(got.sample.seq).toBe(row[ROW.seq]);
      expect(got.sample.tick).toBe(row[ROW.tick]);
      expect(got.sample.ackSeq).toBe(row[ROW.ackSeq]);
      expect([...got.sample.values]).toEqual([...row.subarray(ROW.values)]);
      expect(got.sample.fresh[40]).toBe(row[ROW.group] === 2 ? 1 : 0);
      expect(got.sample.fresh[4]).toBe(row[ROW.group] === 1 ? 1 : 0);
    }
    expect(found).toEqual(expected);
    expect(reader.runs()).toMatchObject([{ bench: "north", latch: null, lostSamples: 0 }]);
    expect(reader.sessions()).toMatchObject([{ kind: "lit", samples: 7000 }]);
    expect(reader.benchText(1)).toBe("name: north\n");
    reader.close();
  });

  test("events come back whole, and numbers go on where they left off", () => {
    const { folder } = scratch;
    const first = recording(folder);
    first.recorder.take({ kind: "event", event: event(1, "connected") });
    first.recorder.take({ kind: "event", event: event(2, "warning", "case-over") });
    first.recorder.close();
    const second = recording(folder);
    expect(second.recorder.lastEventId).toBe(2);
    // A number used twice keeps both events.
    second.recorder.take({ kind: "event", event: event(2, "desk") });
    second.recorder.close();
    const reader = openReader(folder);
    const all = { from: wall(0), to: wall(START_ms * 2) };
    expect(reader.events(all)).toEqual([
      event(1, "connected"),
      event(2, "warning", "case-over"),
      { ...event(2, "desk"), id: 3 },
    ]);
    expect(reader.events(all)[0]?.data).toEqual({ a: 0.1, b: Number.NaN, words: "a word" });
    expect(reader.events(all, "south")).toEqual([]);
    expect(reader.eventsOfRun(2).map((e) => e.kind)).toEqual(["desk"]);
    reader.close();
  });

  test("sessions, bench files and manifests begin at the row they name", () => {
    const { folder } = scratch;
    const { ring, recorder } = recording(folder);
    const make = rowMaker(2, every50ms);
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    for (let i = 0; i < 10; i++) publish(ring, make(i));
    recorder.take({ kind: "session", ringRow: 10, session: "lit", at: wall(START_ms + 500) });
    recorder.take({ kind: "bench", ringRow: 15, benchText: "name: north\ntitle: new\n" });
    for (let i = 10; i < 30; i++) publish(ring, make(i));
    recorder.take({ kind: "session", ringRow: 25, session: "dark", at: wall(START_ms + 1250) });
    recorder.close();
    const reader = openReader(folder);
    expect(reader.sessions().map((s) => [s.kind, s.samples])).toEqual([
      ["dark", 10],
      ["lit", 15],
      ["dark", 5],
    ]);
    // The record is reused, so each is read as it comes.
    const files = Array.from(reader.inputs(1), (input) => input.benchFile);
    expect(files).toEqual([...new Array(15).fill(1), ...new Array(15).fill(2)]);
    reader.close();
  });
});

describe("reading while it is written", () => {
  test("a question begun before a block was packed has each sample once", async () => {
    const { folder } = scratch;
    let now_ms = 0;
    const { ring, recorder } = recording(folder, 2000, { now_ms: () => now_ms });
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    const make = rowMaker(6, every50ms);
    const record = (from: number, to: number): void => {
      for (let i = from; i < to; i++) {
        publish(ring, make(i));
        if (i % 20 === 0) now_ms += 1000;
        recorder.drain();
      }
    };
    record(0, 700);
    recorder.flush();
    const reader = openReader(folder);
    const inputs = reader.inputs(1);
    const numbers = [inputs.next().value.n as number];
    const window = { from: wall(START_ms), to: wall(START_ms + 1e6) };
    const query = { bench: "north", channels: ["current"], window, pixels: 10_000 };
    const asked = reader.series(query);
    record(700, 1500);
    for (const input of inputs) numbers.push(input.n);
    expect(numbers).toEqual(Array.from({ length: 700 }, (_, i) => i + 1));
    expect((await asked).channels.current?.t).toHaveLength(700);
    recorder.flush();
    expect((await reader.series(query)).channels.current?.t).toHaveLength(1500);
    // The folder can be left while somebody reads, and opened again.
    recorder.close();
    expect([...reader.inputs(1)]).toHaveLength(1500);
    recording(folder).recorder.close();
    expect(reader.runs()).toHaveLength(2);
    reader.close();
  });

  test("a civil clock put forward by an hour begins a block that is found", async () => {
    const { folder } = scratch;
    const HOUR_ms = 3_600_000;
    const make = rowMaker(9, every50ms);
    recordRows(
      folder,
      (i) => {
        const row = make(i);
        if (i >= 100) row[ROW.wall_ms] = (row[ROW.wall_ms] as number) + HOUR_ms;
        return row;
      },
      200,
    );
    const reader = openReader(folder);
    const window = { from: wall(START_ms + HOUR_ms + 4000), to: wall(START_ms + HOUR_ms + 9900) };
    const query = { bench: "north", channels: ["current"], window, pixels: 500 };
    const { channels, gaps } = await reader.series(query);
    expect(channels.current?.t).toHaveLength(98);
    expect(gaps).toEqual([{ from: window.from, to: START_ms + HOUR_ms + 5000 }]);
    reader.close();
  });

  test("samples between two sessions get one of their own, and every session an end", () => {
    const { folder } = scratch;
    const { ring, recorder } = recording(folder, 2000, { wall_ms: () => START_ms + 9000 });
    const make = rowMaker(8, every50ms);
    const session = (ringRow: number, kind: "lit" | "end"): void =>
      recorder.take({ kind: "session", ringRow, session: kind, at: wall(START_ms + ringRow * 50) });
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    session(0, "lit");
    session(40, "end");
    for (let i = 0; i < 60; i++) publish(ring, make(i));
    recorder.drain();
    session(60, "lit");
    for (let i = 60; i < 80; i++) publish(ring, make(i));
    recorder.close();
    const reader = openReader(folder);
    expect(
      reader
        .sessions()
        .map((s) => [s.kind, s.samples, s.started - START_ms, (s.ended ?? 0) - START_ms]),
    ).toEqual([
      ["lit", 40, 0, 2000],
      ["dark", 20, 2000, 3000],
      ["lit", 20, 3000, 9000],
    ]);
    reader.close();
  });
});

describe("the latch", () => {
  test("keeps the first cause until reset, and tells that the bench was lit", () => {
    const { folder } = scratch;
    const { recorder } = recording(folder);
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    const reader = openReader(folder);
    const latchOn = (id: number, kind: Parameters<typeof event>[1], hazard = "") => {
      recorder.take({ kind: "event", event: event(id, kind, hazard) });
      const latch = reader.latestLatch("north");
      return latch === null ? null : [latch.cause, latch.lit, latch.serial];
    };
    expect(latchOn(1, "connected")).toBe(null);
    expect(latchOn(2, "armed")).toEqual([-1, true, "S-1"]);
    expect(latchOn(3, "emitting")).toEqual([-1, true, "S-1"]);
    expect(latchOn(4, "dark")).toEqual([-1, false, "S-1"]);
    expect(latchOn(5, "armed")).toEqual([-1, true, "S-1"]);
    expect(latchOn(6, "trip", "case-over")).toEqual([64, false, "S-1"]);
    expect(latchOn(7, "trip", "link-lost")).toEqual([64, false, "S-1"]);
    expect(latchOn(8, "reset", "case-over")).toEqual([-1, false, "S-1"]);
    reader.close();
    recorder.close();
  });
});

describe("what cannot be kept is counted", () => {
  test("rows overwritten before they were read are lost by number, the others are kept", () => {
    const { folder } = scratch;
    const { ring, recorder } = recording(folder, 100);
    recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    const make = rowMaker(3, every50ms);
    for (let i = 0; i < 50; i++) publish(ring, make(i));
    recorder.drain();
    for (let i = 50; i < 350; i++) publish(ring, make(i));
    recorder.drain();
    // Row 250 lies in the slot that the writer fills next.
    expect(recorder.lostRows).toBe(201);
    recorder.close();
    const reader = openReader(folder);
    const kept = Array.from(reader.inputs(1), (input) => input.n);
    expect(reader.runs()[0]?.lostSamples).toBe(201);
    reader.close();
    expect(kept).toEqual([
      ...Array.from({ length: 50 }, (_, i) => i + 1),
      ...Array.from({ length: 99 }, (_, i) => i + 252),
    ]);
  });

  test("a damaged block is named and the rest is served", async () => {
    const { folder } = scratch;
    recordRows(folder, rowMaker(4, every50ms), 5000);
    const { default: Database } = await import("better-sqlite3");
    const db = new Database(`${folder}/record.sqlite`);
    db.exec("UPDATE blocks SET blob = zeroblob(500) WHERE id = 2");
    const blocks = db.prepare("SELECT count(*) FROM blocks").pluck().get();
    db.close();
    const reader = openReader(folder);
    const kept = [...reader.inputs(1)].length;
    reader.close();
    expect(blocks).toBe(5);
    expect(kept).toBe(3800);
    expect([...reader.faults].join()).toMatch(/^block 2 cannot be read: its checksum is/);
  });
});

test("the ring that tests write is the ring of the model", () => {
  expect(new Ring(new SharedArrayBuffer(ringBytes(3))).rows).toBe(3);
});
