import { type ChildProcess, spawn } from "node:child_process";
import { once } from "node:events";
import { createInterface } from "node:readline";
import { describe, expect, test } from "vitest";
import type { FromRecorder } from "../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../daemon/model/ring.ts";
import { wall } from "../../daemon/model/times.ts";
import { builtFile } from "../../daemon/paths.ts";
import { RecorderClient } from "../../daemon/record/client.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { seeded } from "../unit/record/row-maker.ts";
import { scratchFolder } from "../unit/record/synthetic.ts";

/** What is allowed to be missing after a kill. */
const SAMPLES_LOST_ms = 1000;
const EVENT_DURABLE_ms = 200;
const KILLS = 5;
const seed = 99;

interface Told {
  readonly kind?: string;
  readonly event?: number;
  readonly at?: number;
  readonly refused?: string;
}

/** A recording process, the events it has named, and a wait for something it says. */
class Writer {
  readonly child: ChildProcess;
  readonly events: { readonly id: number; readonly at: number }[] = [];
  #until: ((told: Told) => void) | null = null;

  constructor(folder: string) {
    this.child = spawn(
      process.execPath,
      [builtFile("test/programs/record-writer.js").pathname, folder],
      {
        stdio: ["ignore", "pipe", "inherit"],
      },
    );
    const { stdout } = this.child;
    if (stdout === null) throw new Error("the writer has no stdout");
    createInterface({ input: stdout }).on("line", (line) => {
      const told = JSON.parse(line) as Told;
      if (told.event !== undefined) this.events.push({ id: told.event, at: told.at ?? 0 });
      this.#until?.(told);
    });
  }

  until(what: (told: Told) => boolean): Promise<Told> {
    return new Promise((resolve, reject) => {
      this.child.once("exit", () => reject(new Error("the writer ended before it was killed")));
      this.#until = (told) => {
        if (what(told)) resolve(told);
      };
    });
  }

  async kill(): Promise<number> {
    const exit = once(this.child, "exit");
    const at = Date.now();
    this.child.kill("SIGKILL");
    await exit;
    return at;
  }
}

describe(`killed between any two writes (seed ${seed})`, () => {
  test("a prefix is kept, at most the last second is missing, and no event", async () => {
    const random = seeded(seed);
    const { folder, remove } = scratchFolder();
    const named: { readonly id: number; readonly at: number }[] = [];
    for (let kill = 1; kill <= KILLS; kill++) {
      const writer = new Writer(folder);
      const goal = 14 + Math.floor(random() * 12);
      await writer.until(() => writer.events.length >= goal);
      const killedAt = await writer.kill();
      named.push(...writer.events.filter((e) => e.at <= killedAt - EVENT_DURABLE_ms));

      const reader = openReader(folder);
      const inputs = Array.from(reader.inputs(kill), (input) => input.n);
      expect(inputs).toEqual(inputs.map((_, i) => i + 1));
      const session = reader.sessions().find((s) => s.run === kill);
      expect(killedAt - (session?.last ?? 0)).toBeLessThanOrEqual(SAMPLES_LOST_ms);
      const kept = new Set(reader.events({ from: wall(0), to: wall(1e15) }).map((e) => e.id));
      expect(named.filter((e) => !kept.has(e.id))).toEqual([]);
      expect(reader.faults.size).toBe(0);
      reader.close();
    }
    await expectRepaired(folder);
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
  expect(counts.every((n) => n > 50)).toBe(true);
  expect(counts.map((_, i) => [...reader.inputs(i + 1)].length)).toEqual(counts);
  for (const session of reader.sessions()) {
    expect(session.ended).toBe(session.last);
    const window = { from: session.started, to: wall(session.last + 1) };
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
    await expect(next.opened).resolves.toMatchObject({ latch: null });
    await next.close();
    remove();
  });
});
