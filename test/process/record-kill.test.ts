import { spawnSync } from "node:child_process";
import { describe, expect, test } from "vitest";
import type { FromRecorder } from "../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../daemon/model/ring.ts";
import { wall } from "../../daemon/model/times.ts";
import { RecorderClient } from "../../daemon/record/client.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { killing, Writer } from "../programs/killing.ts";
import { scratchFolder } from "../unit/record/synthetic.ts";

const KILLS = 15;
const seed = 99;

describe(`killed at random moments (seed ${seed})`, () => {
  test("a prefix is kept, at most the last second is missing, no event, and no mark of light", async () => {
    const { folder, remove } = scratchFolder();
    const { lostSamplesMaxSeconds, ...found } = await killing(folder, KILLS, seed);
    expect(found).toEqual({ kills: KILLS, lostEvents: 0, rearmed: 0, unreadable: 0 });
    expect(lostSamplesMaxSeconds).toBeLessThanOrEqual(1);
    await expectRepaired(folder);
    remove();
  });
});

/** No write beyond the first megabyte: the disk answers with an error, and not that it is full. */
const SMALL_FILES = 'trap "" XFSZ; ulimit -S -f 1000';

describe("a disk that answers with errors", () => {
  test("is told of, holds nobody up, and when it answers again nothing is lost", async () => {
    const { folder, remove } = scratchFolder();
    const writer = new Writer(folder, SMALL_FILES);
    await writer.until((told) => told.kind === "opened");
    const failing = await writer.until((told) => told.failing === true);
    expect(failing.words).toContain("The disk answered with an error (SQLITE_IOERR");
    const during = writer.events.length;
    await writer.until(() => writer.events.length >= during + 10);
    const pid = String(writer.child.pid);
    expect(spawnSync("prlimit", ["--pid", pid, "--fsize=unlimited"]).status).toBe(0);
    expect(await writer.until((told) => told.failing === false)).toMatchObject({
      lostRows: 0,
      words: "",
    });
    const named = writer.events.map((event) => event.id);
    const after = named.length;
    await writer.until(() => writer.events.length >= after + 5);
    await writer.kill();
    const reader = openReader(folder);
    const kept = new Set(reader.events({ from: wall(0), to: wall(1e15) }).map((e) => e.id));
    expect(named.filter((id) => !kept.has(id))).toEqual([]);
    const inputs = Array.from(reader.inputs(1), (input) => input.n);
    expect(inputs).toEqual(inputs.map((_, i) => i + 1));
    expect(reader.faults.size).toBe(0);
    reader.close();
    remove();
  });
});

/** The next daemon packs what the killed ones left: sessions ended, rollups whole, nothing twice. */
async function expectRepaired(folder: string): Promise<void> {
  const before = openReader(folder);
  const counts = before.runs().map((run) => [...before.inputs(run.id)].length);
  before.close();
  const client = startHere(folder);
  await client.opened;
  await client.close();
  const reader = openReader(folder);
  expect(counts.some((n) => n > 50)).toBe(true);
  expect(counts.map((_, i) => [...reader.inputs(i + 1)].length)).toEqual(counts);
  for (const session of reader.sessions()) {
    expect(session.ended).toBe(session.last);
    const window = { from: session.started, to: wall(session.last + 1001) };
    const query = { bench: "north", channels: ["current"], window, pixels: 1 };
    const { channels, step_ms } = await reader.series(query);
    expect(step_ms).toBeGreaterThanOrEqual(1000);
    const counted = channels.current?.n.reduce((sum, n) => sum + n, 0);
    expect(counted).toBeGreaterThanOrEqual(session.samples);
  }
  reader.close();
}

function startHere(
  folder: string,
  tell: (message: FromRecorder) => void = () => undefined,
): RecorderClient {
  const ring = new Ring(new SharedArrayBuffer(ringBytes(100)));
  return new RecorderClient(
    { folder, bench: "north", benchText: "name: north\n", judgeVersion: 1, ring: ring.memory },
    tell,
  );
}

describe("a recorder that ends by itself", () => {
  test("is told, and what is posted afterwards holds nobody up", async () => {
    const { folder, remove } = scratchFolder();
    const told: FromRecorder[] = [];
    const client = startHere(folder, (message) => told.push(message));
    await client.opened;
    client.post({ kind: "manifest", ringRow: 0, manifest: undefined as never });
    await client.flush();
    expect(told.at(-1)).toMatchObject({
      kind: "failed",
      what: "The recorder ended by itself; nothing more is recorded.",
    });
    client.post({ kind: "event", event: undefined as never });
    await client.flush();
    await client.close();
    const next = startHere(folder);
    await next.opened;
    await next.close();
    remove();
  });
});

describe("one data folder, two daemons", () => {
  test("the second is refused and told whose it is; after a kill the folder is free", async () => {
    const { folder, remove } = scratchFolder();
    const first = new Writer(folder);
    await first.until((told) => told.kind === "opened");
    const here = startHere(folder);
    await expect(here.opened).rejects.toMatchObject({
      what: `The data folder ${folder} is in use.`,
      found: `The process ${first.child.pid} has it.`,
    });
    const second = new Writer(folder);
    const told = await second.until((t) => t.refused !== undefined);
    expect(told.refused).toContain(`The process ${first.child.pid} has it.`);
    await second.kill();
    await first.kill();
    const next = startHere(folder);
    await expect(next.opened).resolves.toMatchObject({ latch: { lit: true } });
    await next.close();
    remove();
  });
});
