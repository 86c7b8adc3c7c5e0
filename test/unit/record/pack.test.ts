import { copyFileSync, readdirSync, readFileSync, writeFileSync } from "node:fs";
import { join } from "node:path";
import Database from "better-sqlite3";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { openForReading } from "../../../daemon/record/folder.ts";
import { Keeper } from "../../../daemon/record/keeper.ts";
import type { KeeperDone, KeeperRequest } from "../../../daemon/record/keeper-api.ts";
import { makePack } from "../../../daemon/record/pack.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { Store } from "../../../daemon/record/store.ts";
import { verify } from "../../../daemon/record/verify.ts";
import type { Work } from "../../../daemon/record/work.ts";
import { MANIFEST, publish, rowMaker, START_ms } from "./row-maker.ts";
import { event, recording, scratchFolder } from "./synthetic.ts";

/** Drives a piece of work to its end. */
function ended<T>(work: Work<T>): T {
  for (;;) {
    const step = work.next();
    if (step.done === true) return step.value;
  }
}

/** Asks a folder's keeper as a command would, without a daemon. */
function ask(folder: string, request: KeeperRequest): KeeperDone {
  const store = Store.open(folder, { durability: "none" });
  try {
    return ended(new Keeper(store, null, () => START_ms + 500).work(request));
  } finally {
    store.close();
  }
}

const NEXT_DAY_ms = START_ms + 86_400_000;

/** Two sessions with events, a journal and a note in the second. */
function recordTwo(folder: string, start_ms = START_ms): void {
  const { ring, recorder } = recording(folder, 8000);
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  recorder.take({ kind: "session", ringRow: 0, session: "dark", at: wall(start_ms) });
  // A second without samples, in the middle of the second session.
  const make = rowMaker(3, (i) => i * 50 + (i < 2000 ? 0 : 1000), start_ms);
  for (let i = 0; i < 4000; i++) {
    if (i === 1000) {
      recorder.take({
        kind: "session",
        ringRow: 1000,
        session: "lit",
        at: wall(start_ms + 50_000),
      });
    }
    publish(ring, make(i));
    recorder.drain();
  }
  for (const id of [1, 2]) recorder.take({ kind: "event", event: event(id, "connected") });
  const late = { ...event(3, "warning", "case-over"), wall: wall(start_ms + 60_000) };
  recorder.take({ kind: "event", event: late });
  const entry = { kind: 1, now_ms: 5, request: 1, asker: 1, requestId: 1, value: 1 };
  recorder.take({
    kind: "journal",
    entry: { input: 999_999, ...entry, fact: 0, factValue: 0 },
  });
  recorder.take({ kind: "journal", entry: { input: 0, ...entry, fact: 0, factValue: 0 } });
  recorder.close();
}

const blobs = (folder: string, session: number): Buffer[] => {
  const db = openForReading(folder);
  const found = db
    .prepare("SELECT blob FROM blocks WHERE session = ? ORDER BY t0, input0")
    .pluck()
    .all(session) as Buffer[];
  db.close();
  return found;
};

const check = (folder: string) => {
  const db = openForReading(folder);
  const found = ended(verify(db));
  db.close();
  return found;
};

/** Steps until some rows of the arriving session, but not all, are there. */
function halfWay(store: Store, work: Work<KeeperDone>): void {
  const blocks = (): unknown =>
    store.within((db) => db.prepare("SELECT count(*) FROM blocks WHERE session = 3").pluck().get());
  while (blocks() === 0) expect(work.next().done).toBe(false);
}

const scratch = scratchFolder();
const { folder } = scratch;
const pack = `${folder}.pack`;
beforeAll(() => {
  recordTwo(folder);
  const note = { verb: "note", wall_ms: null, who: "someone", text: "a note", picture: null };
  ask(folder, { ...note, verb: "note", session: 2 });
  ask(folder, { verb: "tag", session: 2, tag: "good night", does: "set" });
  const db = openForReading(folder);
  ended(makePack(db, 2, pack, START_ms));
  db.close();
});
afterAll(() => scratch.remove());

describe("a pack", () => {
  test("is read like a folder, and holds that session alone", async () => {
    const reader = openReader(pack);
    expect(reader.sessions().map(({ id, samples }) => ({ id, samples }))).toEqual([
      { id: 2, samples: 3000 },
    ]);
    expect(reader.events({ from: wall(0), to: wall(1e15) }).map((e) => e.id)).toEqual([3]);
    const window = { from: wall(START_ms), to: wall(START_ms + 300_000) };
    const query = { bench: "north", channels: ["current"], window, pixels: 20 };
    const answer = await reader.series(query);
    expect(answer.channels.current?.n.reduce((sum, n) => sum + n, 0)).toBe(3000);
    reader.close();
    expect(check(pack).faults).toEqual([]);
  });

  test("comes back elsewhere, byte by byte, with its note, tag, events and inputs", () => {
    const other = scratchFolder();
    // Somebody else's night is there already: numbers must not clash.
    recordTwo(other.folder, NEXT_DAY_ms);
    const { id } = ask(other.folder, { verb: "unpack", file: pack });
    expect(id).toBe(3);
    expect(blobs(other.folder, 3)).toEqual(blobs(folder, 2));
    const db = openForReading(other.folder);
    expect(db.prepare("SELECT session, who, text FROM notes").all()).toEqual([
      { session: 3, who: "someone", text: "a note" },
    ]);
    expect(db.prepare("SELECT session, tag FROM tags").all()).toEqual([
      { session: 3, tag: "good night" },
    ]);
    db.close();
    const gaps = (at: string): unknown[] => {
      const record = openForReading(at);
      const found = record.prepare("SELECT from_wall_ms, to_wall_ms FROM gaps").all();
      record.close();
      return found;
    };
    expect(gaps(pack)).toHaveLength(1);
    expect(gaps(other.folder)).toEqual(expect.arrayContaining(gaps(pack)));
    const minutes = openForReading(other.folder);
    // 4000 samples were here, 3000 came: each counts once in the statistics of its minute.
    const counted = "SELECT sum(r.n) FROM rollup_1min r JOIN channels c ON c.id = r.channel";
    expect(minutes.prepare(`${counted} WHERE c.name = 'current'`).pluck().get()).toBe(7000);
    minutes.close();
    const from = openReader(folder);
    const to = openReader(other.folder);
    const run = to.sessions().find((s) => s.id === 3)?.run ?? 0;
    const inputs = [...to.inputs(run)].map((i) => i.n);
    expect(inputs).toHaveLength(3001);
    expect(to.eventsOfRun(run).map((e) => e.data)).toEqual(
      from
        .eventsOfRun(1)
        .filter((e) => e.id === 3)
        .map((e) => e.data),
    );
    from.close();
    to.close();
    expect(check(other.folder)).toMatchObject({ sessions: 3, samples: 7000, faults: [] });
    other.remove();
  });

  test("that is here already is refused, and one that was ended half way leaves nothing", () => {
    const other = scratchFolder();
    const before = ((): unknown => {
      recordTwo(other.folder, NEXT_DAY_ms);
      return check(other.folder);
    })();
    expect(() => ask(folder, { verb: "unpack", file: pack })).toThrow(/It is session 2/);
    const store = Store.open(other.folder, { durability: "none" });
    const work = new Keeper(store, null).work({ verb: "unpack", file: pack });
    halfWay(store, work);
    work.return({ kind: "done", id: 0, words: "" });
    store.close();
    expect(check(other.folder)).toEqual(before);
    other.remove();
  });

  test("half of one that a killed daemon left is taken away at the next start", () => {
    const other = scratchFolder();
    recordTwo(other.folder, NEXT_DAY_ms);
    const before = check(other.folder);
    const store = Store.open(other.folder, { durability: "none" });
    const work = new Keeper(store, null).work({ verb: "unpack", file: pack });
    halfWay(store, work);
    // The process is gone: nothing after the last commit happens.
    store.close();
    ask(other.folder, { verb: "tag", session: 1, tag: "x", does: "set" });
    expect(check(other.folder)).toEqual(before);
    other.remove();
  });

  test("is never written over, and a missing session makes no file", () => {
    const db = openForReading(folder);
    const bytes = readFileSync(pack);
    expect(() => ended(makePack(db, 1, pack, 0))).toThrow(/is there already/);
    expect(readFileSync(pack).equals(bytes)).toBe(true);
    expect(() => ended(makePack(db, 77, `${folder}.other`, 0))).toThrow(/no session 77/);
    const work = makePack(db, 2, `${folder}.other`, 0);
    work.next();
    work.return({ format: 1, bench: "", session: 0, made_wall_ms: 0 });
    db.close();
    expect(readdirSync(join(folder, "..")).sort()).toEqual(["data", "data.pack"]);
  });

  test("whose samples were changed is refused by unpack, and named by verify", () => {
    const changed = `${folder}.changed`;
    copyFileSync(pack, changed);
    const db = new Database(changed);
    const blob = db.prepare("SELECT blob FROM blocks LIMIT 1").pluck().get() as Buffer;
    blob[blob.length - 1] = (blob[blob.length - 1] ?? 0) ^ 1;
    db.prepare("UPDATE blocks SET blob = ? WHERE id = (SELECT min(id) FROM blocks)").run(blob);
    db.close();
    const other = scratchFolder();
    expect(() => ask(other.folder, { verb: "unpack", file: changed })).toThrow(
      /damaged.*blocks does not match its hash/,
    );
    const { faults } = check(changed);
    expect(faults.join("; ")).toMatch(/block \d+ cannot be read.*its checksum/);
    expect(faults.join("; ")).toMatch(/the pack: blocks does not match its hash/);
    other.remove();
  });

  test.each([
    ["junk", "not a pack at all, but long enough to be looked at", /no pack|no record/],
    ["nothing", "", /no pack|no record/],
  ])("%s in its place is refused in words", (_name, text, words) => {
    const file = `${folder}.junk`;
    writeFileSync(file, text);
    expect(() => ask(folder, { verb: "unpack", file })).toThrow(words);
    expect(() => ask(folder, { verb: "unpack", file: `${folder}.absent` })).toThrow(/no pack/);
    expect(() => ask(folder, { verb: "unpack", file: join(folder, "record.sqlite") })).toThrow(
      /It is a record, but no pack/,
    );
  });
});

describe("verify", () => {
  test("a broken block is named and the rest is checked; counts and unkept gaps are told", () => {
    const other = scratchFolder();
    recordTwo(other.folder, NEXT_DAY_ms);
    expect(check(other.folder)).toMatchObject({ sessions: 2, samples: 4000, faults: [] });
    const db = new Database(join(other.folder, "record.sqlite"));
    db.exec("UPDATE blocks SET crc = crc + 1 WHERE id = 2");
    db.exec("UPDATE sessions SET samples = samples + 5 WHERE id = 1");
    db.exec("UPDATE blocks SET t0 = t0 + 400, t1 = t1 + 600000 WHERE id = 1");
    db.close();
    expect(check(other.folder).faults).toEqual([
      "block 1 does not begin when it says",
      expect.stringMatching(/^block 2 cannot be read: its checksum is \d+, \d+ was stored/),
      "session 1 counts 1005 samples, its blocks hold 1000",
    ]);
    other.remove();
  });
});

describe("notes and tags", () => {
  test("with a picture, at a moment, of no session", () => {
    const other = scratchFolder();
    recordTwo(other.folder, NEXT_DAY_ms);
    const png = Buffer.from("89504e470d0a1a0a", "hex").toString("base64");
    const base = { verb: "note", who: "someone", text: "seen", picture: png } as const;
    ask(other.folder, { ...base, session: null, wall_ms: START_ms + 7 });
    const db = openForReading(other.folder);
    expect(db.prepare("SELECT bench, wall_ms, session, picture_type FROM notes").get()).toEqual({
      bench: "north",
      wall_ms: START_ms + 7,
      session: null,
      picture_type: "image/png",
    });
    db.close();
    other.remove();
  });

  test.each([
    [{ text: " " }, /1 to 4000 characters/],
    [{ picture: Buffer.from("text").toString("base64") }, /PNG or a JPEG/],
    [{ session: 99 }, /no session 99/],
  ])("%o is refused and nothing is kept", (wrong, words) => {
    const base = { verb: "note", who: "", text: "x", picture: null, session: null } as const;
    expect(() => ask(folder, { ...base, wall_ms: null, ...wrong })).toThrow(words);
    expect(() => ask(folder, { verb: "tag", session: 1, tag: "<script>", does: "set" })).toThrow(
      /letters/,
    );
  });
});
