import { existsSync } from "node:fs";
import { join } from "node:path";
import Database from "better-sqlite3";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { rowMaker, START_ms } from "../unit/record/row-maker.ts";
import { recordRows } from "../unit/record/synthetic.ts";
import { type Ended, Place, runCli } from "./daemon.ts";

const place = new Place();
const folder = join(place.folder, "data", "beamsitter", "north");
const pack = join(place.folder, "night.bsp");
const MADE = 2500;

beforeAll(() => {
  recordRows(
    folder,
    rowMaker(4, (i) => i * 50),
    MADE,
  );
});
afterAll(() => place.remove());

const sessions = (...args: string[]): Promise<Ended> => runCli(place, "sessions", ...args);

describe("sessions, at the built command line", () => {
  test("note, tag, list, show: what was kept is told", async () => {
    expect(await sessions("note", "fan", "cleaned", "--session", "1", "--who", "someone")).toEqual({
      code: 0,
      stdout: "Note 1 is kept.\n",
      stderr: "",
    });
    expect((await sessions("tag", "1", "reference", "--json")).code).toBe(0);
    const list = await sessions("--json");
    expect(JSON.parse(list.stdout)).toMatchObject([
      { id: 1, bench: "north", kind: "lit", samples: MADE, notes: 1, tags: ["reference"] },
    ]);
    const { stdout } = await sessions("show", "1");
    expect(stdout).toContain(`${MADE} samples of`);
    expect(stdout).toContain("note 1 by someone: fan cleaned");
  });

  test("pack, read the pack, unpack elsewhere, verify there", async () => {
    expect((await sessions("pack", pack)).code).toBe(0);
    const again = await sessions("pack", pack);
    expect(again).toMatchObject({ code: 4, stderr: expect.stringContaining("is there already") });
    const csv = await runCli(place, "export", "-", "--data", pack, "--channels", "current");
    expect(csv.stdout.trimEnd().split("\r\n")).toHaveLength(MADE + 1);
    const elsewhere = join(place.folder, "elsewhere");
    expect((await sessions("unpack", pack, "--data", elsewhere)).stdout).toBe(
      "It is session 1 here.\n",
    );
    const verified = await sessions("verify", "--data", elsewhere, "--json");
    expect(verified.code).toBe(0);
    expect(JSON.parse(verified.stdout)).toMatchObject({ ok: true, samples: MADE, faults: [] });
    expect((await sessions("note", "x", "--data", pack)).stderr).toContain("is no folder");
  });

  test("import: bad rows are told by line, and --check keeps nothing", async () => {
    const file = place.file(
      "old.csv",
      "time [UTC],current [A]\n2026-01-01 00:00,1\nx,2\n2026-01-01 00:01,2\n",
    );
    const checked = await sessions("import", file, "--check");
    expect(checked).toMatchObject({ code: 0, stdout: expect.stringContaining("Line 3: ") });
    const { stdout, code } = await sessions("import", file, "--json");
    expect(code).toBe(0);
    const { session } = JSON.parse(stdout);
    expect(JSON.parse(stdout)).toMatchObject({ rows: 2, badRows: 1, bad: [{ line: 3 }] });
    const shown = JSON.parse((await sessions("show", String(session), "--json")).stdout);
    expect(shown.session).toMatchObject({ kind: "watched", bench: "north", samples: 2 });
    expect(shown.session.started).toBe(Date.UTC(2026, 0, 1));
    expect(START_ms).toBeGreaterThan(shown.session.started);
  });
});

describe("what cannot be read or written, at the built command line", () => {
  test("a broken block is named, the rest is served, and the exit code says so", async () => {
    const broken = join(place.folder, "broken");
    recordRows(
      broken,
      rowMaker(5, (i) => i * 50),
      MADE,
    );
    const db = new Database(join(broken, "record.sqlite"));
    db.exec("UPDATE blocks SET crc = crc + 1 WHERE id = (SELECT min(id) FROM blocks)");
    const left = db.prepare("SELECT sum(n) FROM blocks WHERE id > 1").pluck().get();
    db.close();
    const verified = await sessions("verify", "--data", broken);
    expect(verified.code).toBe(1);
    expect(verified.stdout).toMatch(/Damaged: block 1 cannot be read: its checksum is \d+/);
    const csv = await runCli(place, "export", "-", "--data", broken, "--channels", "current");
    expect(csv).toMatchObject({ code: 0, stderr: expect.stringMatching(/Left out: block 1 /) });
    expect(csv.stdout.trimEnd().split("\r\n")).toHaveLength(Number(left) + 1);
  });

  test("no data folder, a newer version, junk, no such session: each with what to do", async () => {
    const none = await sessions("--data", join(place.folder, "nowhere"));
    expect(none).toMatchObject({ code: 4, stderr: expect.stringContaining("is no data folder") });
    const newer = join(place.folder, "newer");
    recordRows(
      newer,
      rowMaker(5, (i) => i * 50),
      20,
    );
    const db = new Database(join(newer, "record.sqlite"));
    db.pragma("user_version = 99");
    db.close();
    for (const command of [["verify"], ["note", "x"]]) {
      const { code, stderr } = await sessions(...command, "--data", newer);
      expect({ code, stderr }).toMatchObject({
        code: 4,
        stderr: expect.stringContaining("was written by a newer beamsitter"),
      });
    }
    const junk = place.file("junk.bsp", "words");
    const unpacked = await sessions("unpack", junk);
    expect(unpacked).toMatchObject({ code: 4, stderr: expect.stringContaining("is no pack") });
    const absent = await sessions("show", "77");
    expect(absent).toMatchObject({ code: 2, stderr: expect.stringContaining("no session 77") });
    const out = join(place.folder, "out.parquet");
    const odd = await runCli(place, "export", out, "--format", "xlsx");
    expect(odd).toMatchObject({
      code: 2,
      stderr: expect.stringContaining("There are csv, parquet"),
    });
    expect(existsSync(out)).toBe(false);
  });
});
