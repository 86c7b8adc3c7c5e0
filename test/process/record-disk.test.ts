import { spawnSync } from "node:child_process";
import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { crc32 } from "node:zlib";
import Database from "better-sqlite3";
import { describe, expect, onTestFinished, test } from "vitest";
import type { FromRecorder } from "../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../daemon/model/ring.ts";
import { wall } from "../../daemon/model/times.ts";
import { RecorderClient } from "../../daemon/record/client.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { MANIFEST, publish, rowMaker } from "../unit/record/row-maker.ts";
import { event, recording, scratchFolder } from "../unit/record/synthetic.ts";

/** A small disk of our own, where this user may mount one. */
function smallDisk(): string | null {
  const at = mkdtempSync(join(tmpdir(), "beamsitter-disk-"));
  if (spawnSync("mount", ["-t", "tmpfs", "-o", "size=4m", "tmpfs", at]).status === 0) return at;
  rmSync(at, { recursive: true });
  return null;
}

function unmount(disk: string): void {
  spawnSync("umount", [disk]);
  rmSync(disk, { recursive: true });
}

const probe = smallDisk();
if (probe !== null) unmount(probe);
const NO_DISK = probe === null;

/** A recorder in its worker, and a wait for something it tells. */
class Daemon {
  readonly ring = new Ring(new SharedArrayBuffer(ringBytes(4000)));
  readonly client: RecorderClient;
  #until: ((message: FromRecorder) => void) | null = null;

  constructor(folder: string) {
    const start = { folder, bench: "north", benchText: "name: north\n", judgeVersion: 1 };
    this.client = new RecorderClient({ ...start, ring: this.ring.memory }, (m) => this.#until?.(m));
  }

  until(what: (message: FromRecorder) => boolean): Promise<FromRecorder> {
    return new Promise((resolve) => {
      this.#until = (message) => {
        if (what(message)) resolve(message);
      };
    });
  }
}

const isFailing = (failing: boolean) => (m: FromRecorder) =>
  m.kind === "state" && m.failing === failing;

describe.skipIf(NO_DISK)("a small disk of its own (needs the right to mount)", () => {
  test("full: it says so, the daemon's side is not held up, and it goes on when there is room", async () => {
    const disk = smallDisk() as string;
    onTestFinished(() => unmount(disk));
    const folder = join(disk, "data");
    const daemon = new Daemon(folder);
    await daemon.client.opened;
    const { client, ring } = daemon;
    client.post({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
    const make = rowMaker(1, (i) => i * 50);
    const ballast = join(disk, "ballast");
    spawnSync("dd", ["if=/dev/zero", `of=${ballast}`, "bs=4096"]);

    const full = daemon.until(isFailing(true));
    let worst_ms = 0;
    for (let i = 0; i < 1000; i++) {
      const before = performance.now();
      publish(ring, make(i));
      if (i % 100 === 0) client.post({ kind: "event", event: event(1 + i / 100, "warning") });
      worst_ms = Math.max(worst_ms, performance.now() - before);
    }
    expect(await full).toMatchObject({ words: expect.stringContaining("The disk is full.") });
    // Generous for a loaded machine; a write that waited for the disk would take its timeout.
    expect(worst_ms).toBeLessThan(100);
    client.post({ kind: "event", event: event(11, "trip", "case-over") });

    const again = daemon.until(isFailing(false));
    rmSync(ballast);
    expect(await again).toMatchObject({ lostRows: 0, words: "" });
    await client.close();
    const reader = openReader(folder);
    expect([...reader.inputs(1)]).toHaveLength(1000);
    const events = reader.events({ from: wall(0), to: wall(1e15) }).map((e) => e.id);
    expect(events).toEqual([1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11]);
    expect(reader.latestLatch("north")?.cause).toBe(64);
    reader.close();
  });

  test("full at start, and read-only at start: refused with what to do", async () => {
    const disk = smallDisk() as string;
    onTestFinished(() => unmount(disk));
    const ballast = join(disk, "ballast");
    spawnSync("dd", ["if=/dev/zero", `of=${ballast}`, "bs=4096"]);
    await expect(new Daemon(join(disk, "data")).client.opened).rejects.toMatchObject({
      found: "The disk is full.",
      remedy: "Free some space there; recording goes on by itself.",
    });
    rmSync(ballast);
    const good = new Daemon(join(disk, "data"));
    await good.client.opened;
    good.client.post({ kind: "event", event: event(1, "connected") });
    await good.client.close();

    spawnSync("mount", ["-o", "remount,ro", disk]);
    await expect(new Daemon(join(disk, "data")).client.opened).rejects.toMatchObject({
      found: expect.stringContaining("The folder is read-only for this user"),
    });
    const reader = openReader(join(disk, "data"));
    expect(reader.events({ from: wall(0), to: wall(1e15) })).toHaveLength(1);
    reader.close();
  });
});

describe("something else in its place", () => {
  test.each([
    [
      "junk",
      (file: string) => writeFileSync(file, "not a database at all"),
      /no record of beamsitter.*does not begin as an SQLite/,
    ],
    ["a folder", (file: string) => mkdirSync(file), /no record of beamsitter.*not a file/],
    [
      "another program's database",
      (file: string) => new Database(file).exec("CREATE TABLE theirs (x)").close(),
      /no record of beamsitter.*another program/,
    ],
    [
      "a newer record",
      (file: string) => {
        const { recorder } = recording(join(file, ".."));
        recorder.close();
        const db = new Database(file);
        db.pragma("user_version = 99");
        db.close();
      },
      /newer beamsitter.*version is 99; this program knows versions up to \d+\./,
    ],
  ])(
    "%s as record.sqlite is refused by both sides and left as it is",
    async (name, make, words) => {
      const { folder, remove } = scratchFolder();
      mkdirSync(folder);
      const file = join(folder, "record.sqlite");
      make(file);
      const bytes = (): number => (name === "a folder" ? 0 : crc32(readFileSync(file)));
      const before = bytes();
      await expect(new Daemon(folder).client.opened).rejects.toThrow(words);
      expect(() => openReader(folder)).toThrow(words);
      expect(bytes()).toBe(before);
      remove();
    },
  );

  test("a file as data folder, and a folder without a record", async () => {
    const { folder, remove } = scratchFolder();
    writeFileSync(folder, "a file");
    await expect(new Daemon(folder).client.opened).rejects.toThrow(/is no folder/);
    await expect(new Daemon(join(folder, "below")).client.opened).rejects.toThrow(/is no folder/);
    rmSync(folder);
    mkdirSync(folder);
    expect(() => openReader(folder)).toThrow(/is no data folder.*no record.sqlite in it/);
    remove();
  });
});
