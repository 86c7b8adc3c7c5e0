import fc from "fast-check";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { openForReading } from "../../../daemon/record/folder.ts";
import type { Place, PlaceKeeper } from "../../../daemon/record/influx-place.ts";
import { lineOf, type Point } from "../../../daemon/record/influx-points.ts";
import type { PointServer, Taken } from "../../../daemon/record/influx-server.ts";
import { HomeTrouble } from "../../../daemon/record/influx-trouble.ts";
import { type Look, SecondHome } from "../../../daemon/record/second-home.ts";
import { MANIFEST, publish, rowMaker, START_ms } from "./row-maker.ts";
import { event, recording, scratchFolder } from "./synthetic.ts";

const seed = 8_243;
const COUNT = 900;
/** Few enough that many writes are needed. */
const POINTS_MAX = 70;

const scratch = scratchFolder();
let look: Look;
let close: () => void;

/** Two blocks and a tail; samples three to a millisecond, and civil time put back once. */
beforeAll(() => {
  const { ring, recorder } = recording(scratch.folder, COUNT + 1);
  const make = rowMaker(2, (i) => Math.floor(i / 3) * 400 - (i > 500 ? 20_000 : 0));
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
  for (let i = 0; i < COUNT; i++) publish(ring, make(i));
  for (let id = 1; id <= 5; id++) recorder.take({ kind: "event", event: event(id, "set") });
  recorder.flush();
  const db = openForReading(scratch.folder);
  look = (work) => work(db);
  close = () => {
    db.close();
    recorder.close();
  };
});
afterAll(() => {
  close();
  scratch.remove();
});

/** What may happen to one write or one saving of the place. */
type Fate = "well" | "lost" | "part" | "unheard" | "split" | "crash";
const fate = fc.constantFrom<Fate>("well", "lost", "part", "unheard", "split", "crash");

class Crash extends Error {}

/** A server that keeps points by what makes them one, and remembers each that changed in between. */
class FakeServer implements PointServer {
  readonly precision = "n";
  readonly kept = new Map<string, string>();
  readonly changed: string[] = [];
  readonly fates: Fate[] = [];

  prepare(): Promise<string> {
    return Promise.resolve("");
  }

  async write(points: readonly Point[]): Promise<Taken> {
    const next = this.fates.pop() ?? "well";
    if (next === "split" && points.length > 1) throw new HomeTrouble("split", "too much");
    if (next === "lost") throw new HomeTrouble("later", "no answer");
    const taken = next === "part" ? points.slice(0, points.length / 2) : points;
    for (const point of taken) this.#keep(lineOf(point));
    if (next === "part" || next === "unheard") throw new HomeTrouble("later", "half an answer");
    if (next === "crash") throw new Crash();
    return { dropped: 0, words: "" };
  }

  #keep(line: string): void {
    const [key = "", fields = "", stamp = ""] = line.split(/(?<!\\) (?=[^ ]*$)|(?<!\\) /, 3);
    const before = this.kept.get(`${key} ${stamp}`);
    if (before !== undefined && before !== fields && !key.includes("sessions")) {
      this.changed.push(line);
    }
    this.kept.set(`${key} ${stamp}`, fields);
  }
}

/** A place that survives a crash only where it was saved. */
class FakeKeeper implements PlaceKeeper {
  saved: Place | null = null;
  readonly fates: Fate[] = [];

  load(): Place | null {
    return this.saved;
  }
  save(place: Place): void {
    const next = this.fates.pop() ?? "well";
    if (next === "crash") throw new Crash();
    this.saved = place;
  }
}

/** Sends everything, starting anew after each crash, as a daemon does. */
async function sendAll(server: FakeServer, keeper: FakeKeeper): Promise<SecondHome> {
  let home = new SecondHome(look, server, keeper, "fake", POINTS_MAX);
  for (;;) {
    try {
      if (!(await home.step())) return home;
    } catch (error) {
      if (error instanceof Crash) home = new SecondHome(look, server, keeper, "fake", POINTS_MAX);
      else if (!(error instanceof HomeTrouble)) throw error;
    }
  }
}

describe(`interrupted at any write (seed ${seed})`, () => {
  test("nothing is lost and nothing stands there twice", async () => {
    const whole = new FakeServer();
    const done = await sendAll(whole, new FakeKeeper());
    expect(done.place).toMatchObject({ samples: COUNT, lost: 0, dropped: 0 });
    const samples = [...whole.kept.keys()].filter((key) => key.startsWith("beamsitter_samples"));
    expect(samples).toHaveLength(COUNT);
    await fc.assert(
      fc.asyncProperty(
        fc.array(fate, { maxLength: 40 }),
        fc.array(fate, { maxLength: 20 }),
        async (writes, saves) => {
          const server = new FakeServer();
          const keeper = new FakeKeeper();
          server.fates.push(...writes);
          keeper.fates.push(...saves);
          const home = await sendAll(server, keeper);
          expect(server.changed).toEqual([]);
          expect(server.kept).toEqual(whole.kept);
          expect(home.waiting).toBe(0);
        },
      ),
      { seed, numRuns: 15 },
    );
  });

  test("a server that refuses one point loses that one alone, and says so", async () => {
    const server = new FakeServer();
    const write = server.write.bind(server);
    server.write = (points) =>
      points.some((p) => p.fields["host.input"]?.toString() === "17i")
        ? Promise.reject(new HomeTrouble("refused", "a strange field"))
        : write(points);
    const home = await sendAll(server, new FakeKeeper());
    expect(home.place.dropped).toBe(1);
    expect(home.words).toBe("A point was left out. a strange field");
    expect([...server.kept.keys()].filter((k) => k.startsWith("beamsitter_samples"))).toHaveLength(
      COUNT - 1,
    );
  });

  test("one that refuses everything is asked again, and nothing is given up", async () => {
    const server = new FakeServer();
    server.write = () => Promise.reject(new HomeTrouble("refused", "not here"));
    const keeper = new FakeKeeper();
    const home = new SecondHome(look, server, keeper, "fake", POINTS_MAX);
    await expect(home.step()).rejects.toMatchObject({ kind: "later", message: "not here" });
    expect(home.place.samples).toBe(0);
    expect(keeper.saved).toBeNull();
  });
});
