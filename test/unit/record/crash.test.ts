import { cpSync } from "node:fs";
import Database from "better-sqlite3";
import { afterEach, describe, expect, test } from "vitest";
import { wall } from "../../../daemon/model/times.ts";
import { openReader } from "../../../daemon/record/reader.ts";
import { COMMIT_ms } from "../../../daemon/record/recorder.ts";
import { MANIFEST, publish, rowMaker, START_ms } from "./row-maker.ts";
import { event, recording, scratchFolder } from "./synthetic.ts";

let scratch = scratchFolder();
afterEach(() => {
  scratch.remove();
  scratch = scratchFolder();
});

const ROWS_A_COMMIT = 40;

/** A recorder that commits every 40 rows; what stands on the disk then is copied for `look`. */
function recordAndCopy(commits: number, look: (copy: string, rows: number) => void): void {
  const { folder } = scratch;
  let now_ms = 0;
  const { ring, recorder } = recording(folder, 2000, { now_ms: () => now_ms });
  const make = rowMaker(1, (i) => i * 50);
  recorder.take({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  recorder.take({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
  for (let commit = 1; commit <= commits; commit++) {
    const rows = commit * ROWS_A_COMMIT;
    for (let i = rows - ROWS_A_COMMIT; i < rows; i++) publish(ring, make(i));
    now_ms += COMMIT_ms;
    recorder.drain();
    // Rows that nobody committed must not matter.
    for (let i = 0; i < 3; i++) recorder.take({ kind: "journal", entry: entry(-1 - i) });
    const copy = `${folder}-${commit}`;
    cpSync(folder, copy, { recursive: true });
    look(copy, rows);
  }
  recorder.close();
}

const entry = (input: number) => ({
  ...{ input, kind: 1, now_ms: 0, request: 0, asker: 0, requestId: 0, value: 0 },
  ...{ fact: 0, factValue: 0 },
});

const numbersOf = (folder: string, run: number): number[] => {
  const reader = openReader(folder);
  const numbers = Array.from(reader.inputs(run), (input) => input.n).filter((n) => n > 0);
  reader.close();
  return numbers;
};

/** Samples of one channel that the one-second rollups know of. */
async function countRolled(folder: string): Promise<number> {
  const reader = openReader(folder);
  const window = { from: wall(START_ms), to: wall(START_ms + 100_000) };
  const query = { bench: "north", channels: ["current"], window, pixels: 20 };
  const { channels } = await reader.series(query);
  reader.close();
  return channels.current?.n.reduce((sum, n) => sum + n, 0) ?? 0;
}

describe("a folder as it stood after any commit", () => {
  test("reopens with every sample committed, once, and records on", async () => {
    const rolled: Promise<number>[] = [];
    recordAndCopy(35, (copy, rows) => {
      const wanted = Array.from({ length: rows }, (_, i) => i + 1);
      expect(numbersOf(copy, 1)).toEqual(wanted);
      const next = recording(copy);
      next.recorder.take({ kind: "event", event: event(1, "connected") });
      next.recorder.close();
      expect(numbersOf(copy, 1)).toEqual(wanted);
      rolled.push(countRolled(copy));
      const db = new Database(`${copy}/record.sqlite`, { readonly: true });
      const one = (sql: string): unknown => db.prepare(sql).pluck().get();
      expect(one("SELECT count(*) FROM tail")).toBe(0);
      expect(one("SELECT count(*) FROM blocks WHERE rolled = 0")).toBe(0);
      for (const table of ["minutes", "hours"]) {
        expect(one(`SELECT sum(n) FROM ${table} WHERE name = 'current'`)).toBe(rows);
      }
      expect(db.prepare("SELECT samples, ended_wall_ms FROM sessions").get()).toEqual({
        samples: rows,
        ended_wall_ms: START_ms + (rows - 1) * 50,
      });
      db.close();
    });
    expect(await Promise.all(rolled)).toEqual(rolled.map((_, i) => (i + 1) * ROWS_A_COMMIT));
  });

  test("a torn chunk is named, and the others are kept", () => {
    recordAndCopy(5, (copy, rows) => {
      if (rows < 5 * ROWS_A_COMMIT) return;
      const db = new Database(`${copy}/record.sqlite`);
      db.exec("UPDATE tail SET blob = substr(blob, 1, 300) WHERE id = 3");
      db.close();
      const { recorder, told } = recording(copy);
      recorder.drain();
      expect(told).toMatchObject([
        {
          words: expect.stringMatching(
            /^Samples of an earlier session cannot be read \(chunk 3 of block 1: its checksum is/,
          ),
        },
      ]);
      recorder.close();
      const numbers = numbersOf(copy, 1);
      expect(numbers).toHaveLength(rows - ROWS_A_COMMIT);
      expect(numbers).not.toContain(2 * ROWS_A_COMMIT + 1);
    });
  });
});
