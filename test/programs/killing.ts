import { type ChildProcess, spawn } from "node:child_process";
import { once } from "node:events";
import { appendFileSync, existsSync } from "node:fs";
import { join } from "node:path";
import { createInterface } from "node:readline";
import { fileURLToPath } from "node:url";
import type { BenchEvent } from "../../daemon/model/event.ts";
import { wall } from "../../daemon/model/times.ts";
import { builtFile } from "../../daemon/paths.ts";
import { openReader } from "../../daemon/record/reader.ts";
import { verify } from "../../daemon/record/verify.ts";
import { seeded } from "../unit/record/row-maker.ts";

/** An event is durable after this; one that was handed over later may be missing. */
const EVENT_DURABLE_ms = 200;
/** Life of a recording process after it opened its folder, ms. */
const LIFE_ms_MIN = 50;
const LIFE_ms_MAX = 1400;

/** What a recording process tells; see record-writer.ts. */
export interface Told {
  readonly kind?: string;
  readonly event?: number;
  readonly at?: number;
  readonly started?: number;
  readonly refused?: string;
  readonly failing?: boolean;
  readonly lostRows?: number;
  readonly words?: string;
  readonly latch?: { readonly lit: boolean; readonly cause: number } | null;
}

/** A recording process, the events it has named, and a wait for something it says. */
export class Writer {
  readonly child: ChildProcess;
  readonly events: { readonly id: number; readonly at: number }[] = [];
  #until: ((told: Told) => void) | null = null;

  /** @param shell words put before the program, as a shell would run them; none for the program alone */
  constructor(folder: string, shell = "") {
    const program = [fileURLToPath(builtFile("test/programs/record-writer.js")), folder];
    const [command, args] =
      shell === ""
        ? [process.execPath, program]
        : ["bash", ["-c", `${shell}; exec "$0" "$@"`, process.execPath, ...program]];
    this.child = spawn(command as string, args as string[], {
      stdio: ["ignore", "pipe", "inherit"],
    });
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

/** What a row of kills came to. */
export interface Killed {
  kills: number;
  /** Longest time before a kill of which nothing was kept, s. At most 1 is allowed. */
  lostSamplesMaxSeconds: number;
  /** Events handed over 200 ms or more before a kill that are missing afterwards. */
  lostEvents: number;
  /** Starts that did not find the mark of a bench that was armed when its recorder was killed. */
  rearmed: number;
  /** Kills after which the record did not open, or had a fault. */
  unreadable: number;
}

/**
 * Kills recording processes at random moments of their lives, on one data folder. After every other
 * kill a torn page stands at the end of the log, as if the last write had been cut by the power.
 */
export async function killing(
  folder: string,
  times: number,
  seed: number,
  told: (kills: number) => void = () => undefined,
): Promise<Killed> {
  const random = seeded(seed);
  const found = { kills: 0, lostSamplesMaxSeconds: 0, lostEvents: 0, rearmed: 0, unreadable: 0 };
  const named: number[] = [];
  let wasArmed = false;
  for (let kill = 1; kill <= times; kill++) {
    const writer = new Writer(folder);
    let started = Number.POSITIVE_INFINITY;
    const opened = await writer.until((t) => t.kind === "opened");
    if (wasArmed && opened.latch?.lit !== true) found.rearmed++;
    const alive = writer.until((t) => {
      if (t.started !== undefined) started = t.started;
      return false;
    });
    const life_ms = LIFE_ms_MIN + random() * (LIFE_ms_MAX - LIFE_ms_MIN);
    await Promise.race([alive, new Promise((resolve) => setTimeout(resolve, life_ms))]);
    alive.catch(() => undefined);
    const killedAt = await writer.kill();
    if (kill % 2 === 0) tearLog(folder, random);
    const durable = writer.events.filter((e) => e.at <= killedAt - EVENT_DURABLE_ms);
    named.push(...durable.map((e) => e.id));
    // The first event of a life is the arming.
    wasArmed ||= durable.length > 0;
    found.kills++;
    look(folder, kill, Math.min(started, killedAt), killedAt, named, found);
    told(kill);
  }
  return found;
}

/** Part of a page, as a write leaves it that the power ended. */
function tearLog(folder: string, random: () => number): void {
  const log = join(folder, "record.sqlite-wal");
  if (!existsSync(log)) return;
  const bytes = Uint8Array.from({ length: 1 + Math.floor(random() * 6000) }, () => random() * 256);
  appendFileSync(log, bytes);
}

function look(
  folder: string,
  run: number,
  started: number,
  killedAt: number,
  named: readonly number[],
  found: Killed,
): void {
  try {
    const reader = openReader(folder);
    const inputs = Array.from(reader.inputs(run), (input) => input.n);
    const isPrefix = inputs.every((n, i) => n === i + 1);
    const last = reader.sessions().find((s) => s.run === run && s.samples > 0)?.last ?? started;
    found.lostSamplesMaxSeconds = Math.max(found.lostSamplesMaxSeconds, (killedAt - last) / 1000);
    const kept = new Set(allEvents(reader).map((event) => event.id));
    found.lostEvents = named.filter((id) => !kept.has(id)).length;
    if (!isPrefix || reader.faults.size > 0 || faultsOf(reader).length > 0) found.unreadable++;
    reader.close();
  } catch (error) {
    process.stderr.write(`kill ${run}: ${String(error)}\n`);
    found.unreadable++;
  }
}

const allEvents = (reader: ReturnType<typeof openReader>): BenchEvent[] =>
  reader.events({ from: wall(0), to: wall(1e15) });

function faultsOf(reader: ReturnType<typeof openReader>): readonly string[] {
  const work = verify(reader.parts().db);
  for (;;) {
    const step = work.next();
    if (step.done !== true) continue;
    for (const fault of step.value.faults) process.stderr.write(`${fault}\n`);
    return step.value.faults;
  }
}
