import { mkdtempSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { crc32 } from "node:zlib";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { ROW } from "../../daemon/model/ring.ts";
import { wall } from "../../daemon/model/times.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import { PlaceFile, placeFile } from "../../daemon/record/influx-place.ts";
import { InfluxServer } from "../../daemon/record/influx-server.ts";
import { HomeTrouble } from "../../daemon/record/influx-trouble.ts";
import { type Look, SecondHome } from "../../daemon/record/second-home.ts";
import { MANIFEST, publish, rowMaker, START_ms, seeded } from "../unit/record/row-maker.ts";
import { event, recording } from "../unit/record/synthetic.ts";
import { influxQl, influxServer, makeUser, type RealServer } from "./influx-servers.ts";

const seed = 5_519;
const MINUTES = 68;
const RATE = 5;
const COUNT = MINUTES * 60 * RATE;
/** The server is away from here on: more than an hour of samples. */
const AWAY = 5 * 60 * RATE;
/** Civil time is put back by 40 s with this sample. */
const PUT_BACK = 9_000;

/** Samples are often read several at a time and then share their millisecond. */
function times(): (i: number) => number {
  const random = seeded(seed);
  const at = new Float64Array(COUNT);
  for (let i = 0; i < COUNT; i++) {
    const own = Math.floor((i * 1000) / RATE);
    at[i] = i > 0 && random() < 0.3 ? (at[i - 1] as number) : own;
  }
  return (i) => (at[i] as number) - (i >= PUT_BACK ? 40_000 : 0);
}

let root = "";
let server: RealServer;
beforeAll(async () => {
  root = mkdtempSync(join(tmpdir(), "beamsitter-influx-"));
  server = await influxServer(join(root, "influx"));
  await server.start();
  await makeUser(server);
});
afterAll(async () => {
  await server?.stop();
  rmSync(root, { recursive: true, force: true });
});

const lookInto =
  (folder: string): Look =>
  (work) => {
    const db = openForReading(folder);
    try {
      return work(db);
    } finally {
      db.close();
    }
  };

const homeOf = (folder: string): SecondHome =>
  new SecondHome(
    lookInto(folder),
    new InfluxServer(server.part, "unused"),
    new PlaceFile(placeFile(folder)),
    server.part.url,
  );

/** Sends until nothing is left. */
async function sendAll(home: SecondHome): Promise<void> {
  while (await home.step());
}

/** By minute of civil time: how many samples, and a checksum over what they hold. */
type Minutes = Map<number, { n: number; crc: number }>;

function minutesOf(samples: Iterable<{ readonly wall: number; readonly line: string }>): Minutes {
  const lines = new Map<number, string[]>();
  for (const { wall: at, line } of samples) {
    const minute = Math.floor(at / 60_000);
    const there = lines.get(minute);
    if (there === undefined) lines.set(minute, [line]);
    else there.push(line);
  }
  return new Map(
    [...lines].map(([minute, all]) => [
      minute,
      { n: all.length, crc: crc32(all.sort().join("\n")) },
    ]),
  );
}

const COLUMNS = ["host.input", "board.tick", "board.seq", "set", "current", "case", "photodiode"];
const SLOW = ["sink", "humidity"];

/** What a row says in the columns that are compared; a channel that it did not bring is null. */
function lineOfRow(row: Float64Array): string {
  const at = (index: number): number => row[ROW.values + index] as number;
  const sink = ((row[ROW.freshLow] as number) & 16) !== 0 ? at(4) : null;
  const humidity = ((row[ROW.freshHigh] as number) & 256) !== 0 ? at(40) : null;
  const facts = [row[ROW.input], row[ROW.tick], row[ROW.seq]];
  return JSON.stringify([...facts, at(0), at(1), at(2), at(3), sink, humidity]);
}

async function minutesThere(): Promise<Minutes> {
  const columns = [...COLUMNS, ...SLOW].map((name) => `"${name}"`).join(", ");
  const rows = await influxQl(server, `SELECT ${columns} FROM beamsitter_samples`);
  return minutesOf(
    rows.map(([at, ...values]) => ({ wall: Number(at), line: JSON.stringify(values) })),
  );
}

describe(`more than an hour without a server (seed ${seed})`, () => {
  test("the record's every minute arrives, by count and checksum, and nothing twice", async () => {
    const folder = join(root, "data");
    const { ring, recorder } = recording(folder, 2000);
    recorder.take({ kind: "manifest", ringRow: 0, manifest: { ...MANIFEST, rate_perS: RATE } });
    recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
    const make = rowMaker(seed, times());
    const rows: Float64Array[] = [];
    const record = (until: number): void => {
      for (let i = rows.length; i < until; i++) {
        const row = make(i);
        rows.push(row);
        publish(ring, row);
        if (i % 997 === 0) recorder.drain();
      }
      recorder.flush();
    };

    record(AWAY);
    recorder.take({ kind: "event", event: event(1, "armed") });
    const first = homeOf(folder);
    await sendAll(first);
    expect(first.words).toBe("");
    expect(await minutesThere()).toEqual(minutesOf(rows.map(sampleOf)));

    record(AWAY + 500);
    const cut = first.step().catch((error: unknown) => expect(error).toBeInstanceOf(HomeTrouble));
    await server.stop();
    // Whether the server still took it or not: the place says no more than what it confirmed.
    await cut;
    const place = first.place;
    record(COUNT);
    await expect(first.step()).rejects.toThrow(/does not answer \(ECONN/);
    expect(first.waiting).toBe(COUNT - place.samples);

    // Another daemon, another server process; the server dies again in the middle.
    const second = homeOf(folder);
    expect(second.place).toEqual(place);
    await server.start();
    await second.step();
    const again = second
      .step()
      .catch((error: unknown) => expect(error).toBeInstanceOf(HomeTrouble));
    await server.stop();
    await again;
    await server.start();
    const third = homeOf(folder);
    recorder.close();
    await sendAll(third);
    expect(third.waiting).toBe(0);
    expect(third.place).toMatchObject({ samples: COUNT, lost: 0, dropped: 0 });
    expect(await minutesThere()).toEqual(minutesOf(rows.map(sampleOf)));
    expect(await influxQl(server, "SELECT kind FROM beamsitter_events")).toHaveLength(1);

    // A place that was lost: everything is sent again, and is the same.
    rmSync(placeFile(folder));
    await sendAll(homeOf(folder));
    expect(await minutesThere()).toEqual(minutesOf(rows.map(sampleOf)));
  });
});

const sampleOf = (row: Float64Array) => ({
  wall: row[ROW.wall_ms] as number,
  line: lineOfRow(row),
});
