import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import type { SeriesAnswer } from "../../daemon/model/series.ts";
import { wall } from "../../daemon/model/times.ts";
import { exportCsv } from "../../daemon/record/export.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import { fetchHome } from "../../daemon/record/influx-fetch.ts";
import { PlaceFile, placeFile } from "../../daemon/record/influx-place.ts";
import { InfluxReader } from "../../daemon/record/influx-reader.ts";
import { InfluxServer } from "../../daemon/record/influx-server.ts";
import { byManifest, type Converter, openReader } from "../../daemon/record/reader.ts";
import { SecondHome } from "../../daemon/record/second-home.ts";
import { MANIFEST, publish, rowMaker, START_ms, seeded } from "../unit/record/row-maker.ts";
import { event, recording } from "../unit/record/synthetic.ts";
import { influxServer, makeUser, type RealServer } from "./influx-servers.ts";

const seed = 6_661;
const COUNT = 12_000;
/** The second board's case channel has another scale, and its samples begin here. */
const OTHER_BOARD = 7000;
const OTHER = {
  ...MANIFEST,
  id: "0badbeef",
  channels: MANIFEST.channels.map((c) => (c.name === "case" ? { ...c, perCount: 0.02 } : c)),
};
const CHANNELS = ["current", "case", "sink", "humidity", "judge.ceiling", "link.loopDelay", "none"];

let root = "";
let folder = "";
let server: RealServer;
let end_ms = 0;

beforeAll(async () => {
  root = mkdtempSync(join(tmpdir(), "beamsitter-reader-"));
  folder = join(root, "data");
  end_ms = recordTwoSessions(folder);
  server = await influxServer(join(root, "influx"));
  await server.start();
  await makeUser(server);
  // A policy of its own, so that every question has to name it; longer than any test's clock.
  Object.assign(server.part, { keep_ms: 50 * 365 * 86_400_000 });
  const db = openForReading(folder);
  const there = new InfluxServer(server.part, "unused");
  const keeper = new PlaceFile(placeFile(folder));
  const home = new SecondHome((work) => work(db), there, keeper, server.part.url);
  while (await home.step());
  expect(home.words).toBe("");
  expect(home.waiting).toBe(0);
  db.close();
});
afterAll(async () => {
  await server?.stop();
  rmSync(root, { recursive: true, force: true });
});

/** 20 samples a second with jitter and two gaps; two sessions, two boards, some events. */
function recordTwoSessions(into: string): number {
  const { ring, recorder } = recording(into, 2000);
  const random = seeded(seed);
  let now = 0;
  const at = Array.from({ length: COUNT }, (_, i) => {
    now += 45 + random() * 10 + (i === 2000 ? 5000 : i === OTHER_BOARD ? 240_000 : 0);
    // Whole tenths of a millisecond, which is what the exported seconds show.
    return Math.round(now * 10) / 10;
  });
  const make = rowMaker(seed, (i) => at[i] as number);
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
  recorder.take({ kind: "event", event: event(1, "armed") });
  for (let i = 0; i < COUNT; i++) {
    if (i === OTHER_BOARD) {
      const begins = wall(START_ms + (at[i] as number));
      recorder.take({ kind: "session", ringRow: i, session: "end", at: begins });
      recorder.take({ kind: "manifest", ringRow: i, manifest: OTHER });
      recorder.take({ kind: "session", ringRow: i, session: "dark", at: begins });
      recorder.take({ kind: "event", event: event(2, "trip", "case-over") });
    }
    publish(ring, make(i));
    if (i % 997 === 0) recorder.drain();
  }
  recorder.close();
  return START_ms + now;
}

/** A falling, straight conversion: the least count is the warmest, and means convert exactly. */
const straight: Converter = (channel, counts) =>
  channel.name === "case" ? 100 - channel.perCount * counts : byManifest(channel, counts);

const relative = (a: number, b: number): number =>
  a === b ? 0 : Math.abs(a - b) / Math.max(1, Math.abs(a), Math.abs(b));

function expectSame(there: SeriesAnswer, here: SeriesAnswer): void {
  expect(there.step_ms).toBe(here.step_ms);
  expect(there.gaps).toEqual(here.gaps);
  expect(Object.keys(there.channels)).toEqual(Object.keys(here.channels));
  for (const [name, trace] of Object.entries(here.channels)) {
    const other = there.channels[name];
    expect(other?.t).toEqual(trace.t);
    expect(other?.n).toEqual(trace.n);
    for (const key of ["min", "mean", "max"] as const) {
      const worst = trace[key].reduce(
        (most, value, i) => Math.max(most, relative(value, other?.[key][i] ?? Number.NaN)),
        0,
      );
      expect(worst, `${name} ${key}`).toBeLessThan(1e-12);
    }
  }
}

describe(`the same session at InfluxDB and in its folder (seed ${seed})`, () => {
  const pictures: readonly (readonly [string, number, number, number])[] = [
    ["every sample of two seconds", 60_000, 2_000, 5000],
    ["pixels of less than a second", 40_000, 120_000, 600],
    ["across the first gap", 90_000, 30_000, 250],
    ["pixels of seconds, the whole of it", -60_000, 1_200_000, 300],
    ["pixels of ten seconds, with both boards", 0, 1_000_000, 60],
    ["before there was anything", -100_000, 50_000, 100],
  ];
  test.each(pictures)("gives the same picture: %s", async (_what, after_ms, length_ms, pixels) => {
    const reader = openReader(folder, straight);
    const home = new InfluxReader(new InfluxServer(server.part, "unused"), straight);
    const from = wall(START_ms + after_ms);
    const window = { from, to: wall(from + length_ms) };
    const query = { bench: "north", channels: CHANNELS, window, pixels };
    expectSame(await home.series(query), await reader.series(query));
    reader.close();
  });

  test("gives the same events and sessions", async () => {
    const reader = openReader(folder);
    const home = new InfluxReader(new InfluxServer(server.part, "unused"), byManifest);
    const window = { from: wall(START_ms), to: wall(end_ms) };
    expect(await home.events(window)).toEqual(reader.events(window));
    const here = reader.sessions().map(({ id, run, kind, started, last, ended, samples }) => {
      return { id, run, kind, started, last, ended, samples };
    });
    expect(await home.sessions("north")).toEqual(here);
    reader.close();
  });

  test("fetched into a folder it is exported as the same text", async () => {
    const fetched = join(root, "fetched");
    const there = new InfluxServer(server.part, "unused");
    await fetchHome(there, { bench: "north" }, fetched);
    const [a, b] = [openReader(folder, straight), openReader(fetched, straight)];
    const csv = (reader: typeof a): string =>
      [...exportCsv(reader, { units: "brackets" })].join("");
    expect(csv(b)).toBe(csv(a));
    expect(csv(a).split("\r\n").length).toBe(COUNT + 2);
    const [one] = b.sessions();
    expect(b.benchText(one?.benchFile ?? 0)).toBe("name: north\n");
    a.close();
    b.close();
  });

  test("an aborted question ends with the reason it was given", async () => {
    const home = new InfluxReader(new InfluxServer(server.part, "unused"), straight);
    const window = { from: wall(START_ms), to: wall(end_ms) };
    const stop = new AbortController();
    const asked = home.series(
      { bench: "north", channels: CHANNELS, window, pixels: 9 },
      stop.signal,
    );
    stop.abort(new Error("nobody looks any more"));
    await expect(asked).rejects.toThrow("nobody looks any more");
  });

  test("a bench that is not there is said, with those that are", async () => {
    const there = new InfluxServer(server.part, "unused");
    await expect(fetchHome(there, { bench: "south" }, join(root, "none"))).rejects.toThrow(
      `has no samples of south in "nights". It has the benches: north.`,
    );
  });
});
