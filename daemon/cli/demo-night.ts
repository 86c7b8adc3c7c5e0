import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { setImmediate } from "node:timers/promises";
import { makeCurve } from "../bench-file/curve.ts";
import { parseBench } from "../bench-file/parse.ts";
import { North } from "../bench-sim/north.ts";
import { ScriptedPerson } from "../bench-sim/scripted-person.ts";
import { JUDGE_VERSION } from "../judge/records.ts";
import { Asking } from "../loop/asking.ts";
import { Lockstep } from "../loop/lockstep.ts";
import { Loop } from "../loop/loop.ts";
import { snapshotOf } from "../loop/snapshot.ts";
import type { Bench } from "../model/bench.ts";
import type { BenchEvent } from "../model/event.ts";
import { Ring, ringBytes } from "../model/ring.ts";
import { wall } from "../model/times.ts";
import { assetFile } from "../paths.ts";
import { Recorder } from "../record/recorder.ts";
import type { NightSummary } from "./answers.ts";
import { NORTH, readBenchText } from "./bench-text.ts";
import { progress } from "./say.ts";

export interface NightOptions {
  readonly length_ms: number;
  readonly seed: number;
  /** Where the record is kept; null throws it away. */
  readonly folder: string | null;
  /** Sixty times as fast as life instead of as fast as possible. */
  readonly paced: boolean;
}

/** Samples per second of a simulated night, and length of one step of board and loop, ms. */
const RATE_perS = 20;
const STEP_ms = 5;
/** The night begins at eight in the evening. */
const BEGIN_ms = wall(Date.UTC(2026, 0, 10, 20));
/** Rows of the ring: a minute, as live. */
const RING_ROWS = RATE_perS * 60;
const SPEED = 60;

/** Runs one night. Deterministic but for `wallSeconds`: the same seed gives the same summary. */
export async function simulateNight(options: NightOptions): Promise<NightSummary> {
  const folder = options.folder ?? mkdtempSync(join(tmpdir(), "beamsitter-demo-"));
  const night = new Night(options.seed, folder);
  const began = performance.now();
  try {
    while (night.elapsed_ms < options.length_ms) {
      night.run(Math.min(options.length_ms, night.elapsed_ms + 60_000));
      progress(`${(night.elapsed_ms / 3_600_000).toFixed(2)} h of the night have passed`);
      // Lets a signal through; nothing else waits here.
      await setImmediate();
      if (options.paced) await pause(began + night.elapsed_ms / SPEED - performance.now());
    }
    return night.summary((performance.now() - began) / 1000);
  } finally {
    progress("");
    night.close();
    if (options.folder === null) rmSync(folder, { recursive: true, force: true });
  }
}

/** Bench north at the demo's rate, with the text that says so: the record must tell what was judged. */
function slowerNorth(): { bench: Bench; text: string } {
  const text = readBenchText(NORTH).replace(/^( {2}rate: )\d+ \/s/m, `$1${RATE_perS} /s`);
  const parsed = parseBench(text);
  if (!parsed.ok) throw new Error(`north.yaml is damaged: ${JSON.stringify(parsed.problems)}`);
  return { bench: parsed.bench, text };
}

const pause = (ms: number): Promise<void> =>
  new Promise((resolve) => setTimeout(resolve, Math.max(0, ms)));

/** Board, loop and recorder in one thread on one simulated clock. */
class Night {
  readonly #loop: Loop;
  readonly #lockstep: Lockstep;
  readonly #recorder: Recorder;
  readonly #asking: Asking;
  readonly #person = new ScriptedPerson();
  readonly #seed: number;
  readonly #ring: Ring;
  readonly #trips: NightSummary["trips"] = [];
  #warnings = 0;
  #sessions = 0;
  #capped_ms = 0;
  #cappedSince_ms = Number.NaN;
  #highest_degC = Number.NEGATIVE_INFINITY;

  constructor(seed: number, folder: string) {
    const { bench, text } = slowerNorth();
    this.#seed = seed;
    this.#ring = new Ring(new SharedArrayBuffer(ringBytes(RING_ROWS)));
    const code = readFileSync(assetFile("firmware-protocol/wasm/controller.wasm"));
    const module = new WebAssembly.Module(code);
    const north = new North({
      bench,
      module,
      seed,
      rate_perS: RATE_perS,
      pass_ms: STEP_ms,
      tick: 0,
    });
    const lockstep = new Lockstep(north, BEGIN_ms);
    this.#lockstep = lockstep;
    this.#recorder = new Recorder({
      folder,
      bench: bench.name,
      benchText: text,
      judgeVersion: JUDGE_VERSION,
      ring: this.#ring.memory,
      // A simulated night is not evidence: it need not outlive a power cut.
      durability: "none",
      wall_ms: () => lockstep.wall(),
    });
    this.#loop = new Loop(
      bench,
      {
        now: () => lockstep.now(),
        wall: () => lockstep.wall(),
        write: (line) => lockstep.write(line),
        drained: () => true,
        record: (message) => {
          if (message.kind === "session" && message.session !== "end") this.#sessions++;
          this.#recorder.take(message);
        },
        event: (_line, event) => this.#event(event),
        curve: makeCurve,
      },
      this.#ring,
      this.#recorder.latchAtOpen,
    );
    this.#loop.telling.startAfter(this.#recorder.lastEventId);
    this.#asking = new Asking(this.#loop);
    this.#loop.onStep = () => this.#asking.settle(lockstep.now());
    lockstep.connect(this.#loop);
  }

  get elapsed_ms(): number {
    return this.#lockstep.elapsed_ms;
  }

  run(to_ms: number): void {
    const second_ms = 1000;
    while (this.#lockstep.elapsed_ms < to_ms) {
      const until = Math.min(to_ms, this.#lockstep.elapsed_ms + second_ms);
      while (this.#lockstep.elapsed_ms < until) this.#lockstep.step(STEP_ms);
      this.#recorder.drain();
      this.#look();
    }
  }

  summary(wallSeconds: number): NightSummary {
    this.#endCap();
    return {
      simulatedSeconds: this.#lockstep.elapsed_ms / 1000,
      samples: this.#ring.written,
      sessions: this.#sessions,
      trips: this.#trips,
      warnings: this.#warnings,
      cappedSeconds: this.#capped_ms / 1000,
      highestCaseC: Math.round(this.#highest_degC * 100) / 100,
      wallSeconds,
      seed: this.#seed,
    };
  }

  close(): void {
    this.#recorder.close();
  }

  /** Once a second: the scripted person looks, and the warmest case is kept. */
  #look(): void {
    const case_degC = this.#loop.out.view.case_degC;
    if (case_degC > this.#highest_degC) this.#highest_degC = case_degC;
    if (this.#loop.out.view.state !== 1) return;
    const question = this.#person.look(
      snapshotOf(this.#loop, {
        wall_ms: this.#lockstep.wall(),
        now_ms: this.#lockstep.now(),
        port: "",
        recorder: { behind_ms: 0, words: "" },
      }),
    );
    if (question === null) return;
    this.#asking.ask({ id: 0, ...question }, this.#lockstep.now(), (answer) =>
      this.#person.told(answer.ok),
    );
  }

  #event(event: BenchEvent): void {
    const at = this.#lockstep.elapsed_ms;
    if (event.kind === "warning") this.#warnings++;
    if (event.kind === "trip") this.#trips.push({ firstOut: event.hazard, atSeconds: at / 1000 });
    if (event.kind === "capped") this.#cappedSince_ms = at;
    if (event.kind === "uncapped" || event.kind === "trip" || event.kind === "dark") this.#endCap();
  }

  #endCap(): void {
    if (Number.isNaN(this.#cappedSince_ms)) return;
    this.#capped_ms += this.#lockstep.elapsed_ms - this.#cappedSince_ms;
    this.#cappedSince_ms = Number.NaN;
  }
}
