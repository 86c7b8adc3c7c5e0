import Database from "better-sqlite3";
import { afterEach, beforeEach, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { type Retired, retire, ruleOf } from "../../../daemon/record/retention.ts";
import { Store } from "../../../daemon/record/store.ts";
import { rowMaker, START_ms } from "./row-maker.ts";
import { recordRows, scratchFolder } from "./synthetic.ts";

const ROWS = 1000;
const DAY_ms = 86_400_000;
const LATER_ms = START_ms + 2 * DAY_ms;
/** A sample a second and more: a block a minute, 17 of them. */
const maker = () => rowMaker(5, (i) => 1000 * i + (i % 3));

let scratch: ReturnType<typeof scratchFolder>;
beforeEach(() => {
  scratch = scratchFolder();
  recordRows(scratch.folder, maker(), ROWS);
});
afterEach(() => scratch.remove());

/** Retires; `before` changes the record first. */
function retired(
  rule: ReturnType<typeof ruleOf>,
  before: (db: Database.Database) => void = () => {},
): Retired {
  const store = Store.open(scratch.folder, { durability: "none" });
  try {
    store.within(before);
    const work = retire(store, "north", rule, LATER_ms);
    for (let step = work.next(); ; step = work.next()) if (step.done) return step.value;
  } finally {
    store.close();
  }
}

function one(sql: string): unknown {
  const db = new Database(`${scratch.folder}/record.sqlite`, { readonly: true });
  try {
    return db.prepare(sql).pluck().get();
  } finally {
    db.close();
  }
}

const FULL = "SELECT count(*) FROM blocks WHERE codec <> 255";

async function asked(pixels: number, length_ms = 1_000_000) {
  const reader = openReader(scratch.folder);
  const window = { from: wall(START_ms), to: wall(START_ms + length_ms) };
  const answer = await reader.series({ bench: "north", channels: ["current"], window, pixels });
  reader.close();
  return answer;
}

describe("retiring the full rate", () => {
  test("by age: what is older goes, its statistics stay, and it is written down", async () => {
    const before = await asked(100);
    const close = await asked(2000, 30_000);
    expect(close.step_ms).toBe(0);
    const found = retired(ruleOf(1, null, null));
    expect(found).toMatchObject({ blocks: 17, samples: ROWS, waiting: 0 });
    expect(found.words).toMatch(
      /^The full rate of 1000 samples from 2026-\d\d-\d\d .* is taken away/,
    );
    expect(one(FULL)).toBe(0);
    expect(one("SELECT sum(samples) FROM retired")).toBe(ROWS);
    expect(await asked(100)).toEqual(before);
    const now = await asked(2000, 30_000);
    expect(now.step_ms).toBe(1000);
    expect(now.channels.current?.n.reduce((a, b) => a + b, 0)).toBe(30);
  });

  test("what is young enough stays", () => {
    expect(retired(ruleOf(3, null, null)).words).toBe("Nothing is taken away.");
    expect(one(FULL)).toBe(17);
  });

  test("by size: the oldest go until the rest fits", () => {
    const bytes = Number(one("SELECT sum(length(blob)) FROM blocks"));
    const found = retired(ruleOf(null, bytes / 2 / 1e9, null));
    expect(Number(one("SELECT sum(length(blob)) FROM blocks"))).toBeLessThanOrEqual(bytes / 2);
    expect(found.blocks).toBeLessThan(17);
    expect(one("SELECT min(id) FROM blocks WHERE codec <> 255")).toBe(found.blocks + 1);
  });

  test("nothing goes that was not exported, where that is asked", () => {
    const rule = ruleOf(1, null, "influx");
    const found = retired(rule);
    expect(found).toMatchObject({ blocks: 0, waiting: 17 });
    expect(found.words).toContain("17 blocks wait: they are not yet exported to influx.");
    const half = retired(rule, (db) => {
      db.prepare("INSERT INTO exported VALUES ('north','influx',0,?,0)").run(START_ms + 300_000);
    });
    expect(half.blocks).toBe(5);
    expect(half.waiting).toBe(12);
  });

  test("around a trip, and where it is marked as kept, the full rate stays for ever", () => {
    const found = retired(ruleOf(1, null, null), (db) => {
      db.prepare("INSERT INTO events VALUES (1,1,'north',1,1,1,?,'trip','case-over','{}')").run(
        START_ms + 600_000,
      );
      db.prepare("INSERT INTO kept VALUES (1,'north',?,?,'a sweep')").run(
        START_ms + 1000,
        START_ms + 2000,
      );
    });
    expect(found.blocks).toBeGreaterThan(10);
    expect(one("SELECT min(id) FROM blocks WHERE codec <> 255")).toBe(1);
    // Two minutes before the trip, half a minute after.
    expect(
      one(`SELECT count(*) FROM blocks WHERE codec <> 255 AND t1 >= ${START_ms + 480_000}
      AND t0 <= ${START_ms + 630_000}`),
    ).toBe(one(`${FULL} AND id > 1`));
  });

  test("a session that is still recorded is left alone", () => {
    const found = retired(ruleOf(1, null, null), (db) => {
      db.exec("UPDATE sessions SET ended_wall_ms = NULL");
    });
    expect(found.blocks).toBe(0);
  });
});
