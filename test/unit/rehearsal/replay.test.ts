import { readFileSync } from "node:fs";
import { afterAll, beforeAll, describe, expect, test } from "vitest";
import { makeCurve } from "../../../daemon/bench-file/curve.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { North } from "../../../daemon/bench-sim/north.ts";
import { simulateNight } from "../../../daemon/cli/demo-night.ts";
import { DIGEST_START, mixOut } from "../../../daemon/judge/digest.ts";
import { JUDGE_VERSION } from "../../../daemon/judge/records.ts";
import { newState, restoreLatch } from "../../../daemon/judge/state.ts";
import { Lockstep } from "../../../daemon/loop/lockstep.ts";
import { Loop } from "../../../daemon/loop/loop.ts";
import { hazardId } from "../../../daemon/loop/telling.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import type { BenchEvent } from "../../../daemon/model/event.ts";
import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import { wall } from "../../../daemon/model/times.ts";
import { assetFile } from "../../../daemon/paths.ts";
import { openReader, type RecordReader } from "../../../daemon/record/reader.ts";
import { Recorder } from "../../../daemon/record/recorder.ts";
import { planOf } from "../../../daemon/rehearsal/plan-of.ts";
import { type Replayed, replay } from "../../../daemon/rehearsal/replay.ts";
import { scratchFolder } from "../record/synthetic.ts";

const SEED = 7;
const STEP_ms = 5;
const RATE_perS = 20;
const BEGIN_ms = Date.UTC(2026, 0, 10, 20);

function northText(): string {
  const text = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
  return text.replace(/^( {2}rate: )\d+ \/s/m, `$1${RATE_perS} /s`);
}

function benchOf(text: string): Bench {
  const parsed = parseBench(text);
  if (!parsed.ok) throw new Error(JSON.stringify(parsed.problems));
  return parsed.bench;
}

interface Lived {
  readonly digest: number;
  readonly inputs: number;
  readonly events: readonly BenchEvent[];
}

/** A life of a daemon on the simulated bench "north", recorded; `night` is what people do. */
class Life {
  readonly loop: Loop;
  readonly #lockstep: Lockstep;
  readonly #recorder: Recorder;
  readonly #events: BenchEvent[] = [];
  #digest = DIGEST_START;
  #inputs = 0;

  constructor(folder: string, text: string) {
    const bench = benchOf(text);
    const ring = new Ring(new SharedArrayBuffer(ringBytes(RATE_perS * 60)));
    const code = readFileSync(assetFile("firmware-protocol/wasm/controller.wasm"));
    const module = new WebAssembly.Module(code);
    const board = { bench, module, seed: SEED, rate_perS: RATE_perS, pass_ms: STEP_ms, tick: 0 };
    const lockstep = new Lockstep(new North(board), wall(BEGIN_ms));
    this.#lockstep = lockstep;
    const recorder = new Recorder({
      folder,
      bench: bench.name,
      benchText: text,
      judgeVersion: JUDGE_VERSION,
      ring: ring.memory,
      durability: "none",
    });
    this.#recorder = recorder;
    const ports = {
      now: () => lockstep.now(),
      wall: () => lockstep.wall(),
      write: (line: string) => lockstep.write(line),
      drained: () => true,
      record: recorder.take.bind(recorder),
      event: (_line: unknown, event: BenchEvent) => void this.#events.push(event),
      curve: makeCurve,
    };
    this.loop = new Loop(bench, ports, ring, recorder.latchAtOpen);
    this.loop.telling.startAfter(recorder.lastEventId);
    this.loop.onStep = () => {
      this.#digest = mixOut(this.#digest, this.loop.out);
      this.#inputs++;
    };
  }

  plug(): void {
    this.#lockstep.connect(this.loop);
  }

  unplug(): void {
    this.#lockstep.disconnect("the cable was pulled");
  }

  adopt(text: string): void {
    this.loop.adopt(benchOf(text), text, this.#lockstep.now());
  }

  request(name: Parameters<Loop["request"]>[0], value: number): void {
    this.loop.request(name, value, "person", 1, this.#lockstep.now());
  }

  pass(seconds: number): void {
    const until = this.#lockstep.elapsed_ms + seconds * 1000;
    while (this.#lockstep.elapsed_ms < until) {
      for (let i = 0; i < 200; i++) this.#lockstep.step(STEP_ms);
      this.#recorder.drain();
    }
  }

  end(): Lived {
    this.#recorder.close();
    return { digest: this.#digest, inputs: this.#inputs, events: this.#events };
  }
}

/** The bench's own limit, in north's text. */
const LIMIT = /^( {2}current: )[^\n]*/m;

/** Arming, setting, dark, another bench file, a cable pulled while emitting, a reset, a sudden end. */
function firstLife(folder: string, text: string): Lived {
  const life = new Life(folder, text);
  life.plug();
  life.pass(10);
  life.request("arm", 1500);
  life.pass(120);
  life.request("set", 1800);
  life.pass(300);
  life.request("dark", 0);
  life.pass(20);
  life.adopt(text.replace(LIMIT, "$11400 mA"));
  life.pass(20);
  life.request("arm", 1200);
  life.pass(60);
  life.unplug();
  life.pass(5);
  life.plug();
  life.pass(10);
  life.request("reset", life.loop.out.view.cause);
  life.pass(10);
  life.request("arm", 1000);
  life.pass(30);
  return life.end();
}

/** The next daemon finds the lit mark of the last one. */
function secondLife(folder: string, text: string): Lived {
  const life = new Life(folder, text);
  life.plug();
  life.pass(20);
  return life.end();
}

const scratch = scratchFolder();
const text = northText();
let lives: Lived[];
let reader: RecordReader;
beforeAll(() => {
  lives = [firstLife(scratch.folder, text), secondLife(scratch.folder, text)];
  reader = openReader(scratch.folder);
});
afterAll(() => {
  reader.close();
  scratch.remove();
});

function replayRun(run: number, change: (benchText: string) => string = (same) => same): Replayed {
  const state = newState();
  const latch = reader.runs()[run - 1]?.latch ?? null;
  if (latch !== null) restoreLatch(state, latch.cause, latch.lit);
  return replay(
    reader.inputs(run),
    (benchFile, manifest) => planOf(change(reader.benchText(benchFile)), reader.manifest(manifest)),
    state,
  );
}

/** Events of kind "link" are told by the loop itself, from what the link said: not by a step. */
function expectSameEvents(record: RecordReader, run: number, again: Replayed): void {
  const judged = record.eventsOfRun(run).filter((event) => event.kind !== "link");
  const plain = (n: unknown): unknown => (Number.isFinite(n) ? n : null);
  expect(
    again.events
      .filter((event) => event.kind !== "link")
      .map((e) => [e.input, e.kind, hazardId(e.hazard), plain(e.a), plain(e.b)]),
  ).toEqual(judged.map((e) => [e.input, e.kind, e.hazard, plain(e.data.a), plain(e.data.b)]));
  expect(judged.length).toBeGreaterThan(0);
}

describe("a recorded life of the daemon, through the same step again", () => {
  test("the night had what a night may have", () => {
    const kinds = new Set(lives[0]?.events.map((event) => event.kind));
    expect([...kinds]).toEqual(
      expect.arrayContaining(["connected", "armed", "emitting", "set", "dark", "trip", "reset"]),
    );
    expect(lives[1]?.events.some((event) => event.kind === "trip")).toBe(true);
  });

  test.each([1, 2])("life %i: every input is there, and every outcome is the same", (run) => {
    const lived = lives[run - 1] as Lived;
    const again = replayRun(run);
    expect(again.missing).toBe(0);
    expect(again.inputs).toBe(lived.inputs);
    expect(again.digest).toBe(lived.digest);
  });

  test.each([1, 2])("life %i: the events are those in the record", (run) => {
    expectSameEvents(reader, run, replayRun(run));
  });

  test("a night of the demo gives the events of its record", async () => {
    const { folder, remove } = scratchFolder();
    await simulateNight({ length_ms: 15 * 60_000, seed: SEED, folder, paced: false });
    const night = openReader(folder);
    const plans = (file: number, manifest: number) =>
      planOf(night.benchText(file), night.manifest(manifest));
    const again = replay(night.inputs(1), plans, newState());
    expect(again.missing).toBe(0);
    expect(again.inputs).toBeGreaterThan(15 * 60 * RATE_perS - 100);
    expectSameEvents(night, 1, again);
    night.close();
    remove();
  });

  test("other limits give another night", () => {
    const lower = (benchText: string): string => benchText.replace(LIMIT, "$1900 mA");
    expect(lower(text)).not.toBe(text);
    const again = replayRun(1, lower);
    expect(again.missing).toBe(0);
    expect(again.digest).not.toBe(lives[0]?.digest);
    expect(again.events).not.toEqual(replayRun(1).events);
  });

  test("both bench files of the first life are in its record", () => {
    const files = new Set(Array.from(reader.inputs(1), (input) => input.benchFile));
    expect([...files].map((id) => reader.benchText(id).match(LIMIT)?.[0])).toEqual([
      text.match(LIMIT)?.[0],
      "  current: 1400 mA",
    ]);
  });

  test("a hole in the record is told as such", () => {
    const [first, ...rest] = Array.from(reader.inputs(2), (input) => ({
      ...input,
      sample: { ...input.sample },
    }));
    const holed = [first, ...rest.slice(5)].filter((input) => input !== undefined);
    expect(replay(holed, () => null, newState()).missing).toBe(5);
  });
});
