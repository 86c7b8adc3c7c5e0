import { describe, expect, onTestFinished, test } from "vitest";
import { Ring, ringBytes } from "../../daemon/model/ring.ts";
import { wall } from "../../daemon/model/times.ts";
import { RecorderClient } from "../../daemon/record/client.ts";
import { openForReading } from "../../daemon/record/folder.ts";
import { keep } from "../../daemon/record/keeper-client.ts";
import { makePack } from "../../daemon/record/pack.ts";
import { MANIFEST, publish, rowMaker, START_ms } from "../unit/record/row-maker.ts";
import { recordRows, scratchFolder } from "../unit/record/synthetic.ts";

/** A recorder in its worker, as a daemon has it, with some samples. */
async function recordingDaemon(folder: string): Promise<RecorderClient> {
  const ring = new Ring(new SharedArrayBuffer(ringBytes(2000)));
  const start = { folder, bench: "north", benchText: "name: north\n", judgeVersion: 1 };
  const client = new RecorderClient({ ...start, ring: ring.memory }, () => undefined);
  await client.opened;
  client.post({ kind: "manifest", ringRow: 0, manifest: MANIFEST });
  client.post({ kind: "session", ringRow: 0, session: "lit", at: wall(START_ms) });
  const make = rowMaker(1, (i) => i * 50);
  for (let i = 0; i < 500; i++) publish(ring, make(i));
  await client.flush();
  return client;
}

const never = new AbortController().signal;
const quiet = { progress: () => undefined, signal: never };
const note = (text: string, session: number | null) =>
  ({ verb: "note", session, wall_ms: null, who: "someone", text, picture: null }) as const;

function told(folder: string, sql: string): unknown[] {
  const db = openForReading(folder);
  const rows = db.prepare(sql).pluck().all();
  db.close();
  return rows;
}

describe("the recorder's own socket", () => {
  test("notes and tags come in while it records, and after it has ended without it", async () => {
    const { folder, remove } = scratchFolder();
    onTestFinished(remove);
    const client = await recordingDaemon(folder);
    expect(await keep(folder, note("while it runs", 1), quiet)).toMatchObject({ id: 1 });
    await keep(folder, { verb: "tag", session: 1, tag: "good", does: "set" }, quiet);
    await expect(keep(folder, note(" ", null), quiet)).rejects.toThrow(/1 to 4000 characters/);
    await expect(keep(folder, note("of none", 9), quiet)).rejects.toThrow(/no session 9/);
    await client.close();
    expect(await keep(folder, note("afterwards", null), quiet)).toMatchObject({ id: 2 });
    expect(told(folder, "SELECT text FROM notes ORDER BY id")).toEqual([
      "while it runs",
      "afterwards",
    ]);
    expect(told(folder, "SELECT tag FROM tags")).toEqual(["good"]);
    expect(told(folder, "SELECT samples FROM sessions")).toEqual([500]);
  });

  test("a pack comes in while it records; whoever goes away half way leaves nothing half", async () => {
    const { folder, remove } = scratchFolder();
    const other = scratchFolder();
    onTestFinished(remove);
    onTestFinished(other.remove);
    const make = rowMaker(2, (i) => i * 1000, START_ms - 90 * 86_400_000);
    recordRows(other.folder, make, 40_000);
    const pack = `${other.folder}.pack`;
    const from = openForReading(other.folder);
    const work = makePack(from, 1, pack, 0);
    while (work.next().done !== true);
    from.close();
    const client = await recordingDaemon(folder);
    const going = new AbortController();
    const progress = (): void => going.abort(new Error("gone"));
    const half = keep(folder, { verb: "unpack", file: pack }, { progress, signal: going.signal });
    await expect(half).rejects.toThrow("gone");
    // The recorder hears of it a moment later: by then it has undone its half, or was already whole.
    const again = keep(folder, { verb: "unpack", file: pack }, quiet);
    const id = await again.then(
      (done) => done.id,
      (problem) => {
        expect(String(problem)).toContain("is here already. It is session 2.");
        return 2;
      },
    );
    await client.close();
    expect(told(folder, "SELECT kind || ' ' || samples FROM sessions ORDER BY id")).toEqual([
      "lit 500",
      "lit 40000",
    ]);
    expect(told(folder, "SELECT DISTINCT session FROM blocks ORDER BY session")).toEqual([1, id]);
  });
});
