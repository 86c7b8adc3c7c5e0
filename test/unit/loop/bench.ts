import { readFileSync } from "node:fs";
import { makeCurve } from "../../../daemon/bench-file/curve.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { North } from "../../../daemon/bench-sim/north.ts";
import { STATES } from "../../../daemon/judge/records.ts";
import { Asking } from "../../../daemon/loop/asking.ts";
import { Lockstep } from "../../../daemon/loop/lockstep.ts";
import { Loop } from "../../../daemon/loop/loop.ts";
import type { LoopAnswer } from "../../../daemon/loop/ports.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import type { BenchEvent } from "../../../daemon/model/event.ts";
import type { StoredLatch, ToRecorder } from "../../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import { wall } from "../../../daemon/model/times.ts";
import { assetFile } from "../../../daemon/paths.ts";

const text = readFileSync(assetFile("daemon/bench-file/benches/north.yaml"), "utf8");
const parsed = parseBench(text);
if (!parsed.ok) throw new Error(JSON.stringify(parsed.problems));

/** Bench north as its file describes it. */
export const north: Bench = parsed.bench;
/** The controller core, compiled once for all boards of a test file. */
export const controllerCore = new WebAssembly.Module(
  readFileSync(assetFile("firmware-protocol/wasm/controller.wasm")),
);

/** The whole chain on a simulated clock: plant, real controller core, link, judge. */
export class Chain {
  readonly board: North;
  readonly lockstep: Lockstep;
  readonly loop: Loop;
  readonly asking: Asking;
  readonly events: BenchEvent[] = [];
  readonly records: ToRecorder[] = [];
  /** Lines the host wrote, newest last. */
  readonly written: string[] = [];
  /** Set to swallow what the host writes: a cable that carries one way only. */
  deaf = false;

  constructor(options: { seed?: number; bench?: Bench; latch?: StoredLatch; tick?: number } = {}) {
    const bench = options.bench ?? north;
    this.board = new North({
      bench: north,
      module: controllerCore,
      seed: options.seed ?? 1,
      rate_perS: 50,
      pass_ms: 1,
      tick: options.tick ?? 0,
    });
    const lockstep = new Lockstep(this.board, wall(Date.UTC(2026, 0, 10, 20)));
    this.lockstep = lockstep;
    this.loop = new Loop(
      bench,
      {
        now: () => lockstep.now(),
        wall: () => lockstep.wall(),
        write: (line) => {
          this.written.push(line);
          return this.deaf || lockstep.write(line);
        },
        drained: () => true,
        record: (message) => this.records.push(message),
        event: (_line, event) => this.events.push(event),
        curve: makeCurve,
      },
      new Ring(new SharedArrayBuffer(ringBytes(600))),
      options.latch ?? null,
    );
    this.asking = new Asking(this.loop);
    this.loop.onStep = () => this.asking.settle(lockstep.now());
    lockstep.connect(this.loop);
  }

  get state(): string {
    return STATES[this.loop.out.view.state] ?? "?";
  }

  /** Whether current flows, at the diode itself. */
  get lit(): boolean {
    return this.board.plant.current_mA > 5;
  }

  /** Lets time pass. */
  run(ms: number): void {
    for (let t = 0; t < ms; t++) {
      this.lockstep.step(1);
      this.asking.settle(this.lockstep.now());
    }
  }

  /** Time until `done`, ms; throws where it takes longer. */
  until(done: () => boolean, ms_max: number): number {
    for (let t = 0; t <= ms_max; t++) {
      if (done()) return t;
      this.run(1);
    }
    throw new Error(`not within ${ms_max} ms; the bench is ${this.state}`);
  }

  /** Asks, and lets time pass until the answer is there. */
  ask(request: Parameters<Asking["ask"]>[0]): LoopAnswer {
    let got: LoopAnswer | null = null;
    this.asking.ask(request, this.lockstep.now(), (a) => {
      got = a;
    });
    this.until(() => got !== null, 6000);
    return got as unknown as LoopAnswer;
  }

  arm(current_mA: number, asker: "person" | "scripted-person" | "away" = "person"): LoopAnswer {
    return this.ask({ id: 1, verb: "arm", current_mA, asker });
  }

  reset(cause: string): LoopAnswer {
    return this.ask({ id: 1, verb: "reset", cause, asker: "person" });
  }

  /** Introduced, its curve loaded, and key and loop closed long enough for the board to believe them. */
  ready(): void {
    this.until(() => this.loop.session.phase === "ready", 5000);
    this.run(700);
  }

  /** Armed and at its current. */
  light(current_mA: number): void {
    this.ready();
    const armed = this.arm(current_mA);
    if (!armed.ok) throw new Error(armed.words);
    this.until(() => this.board.plant.current_mA > current_mA * 0.98, 20_000);
  }
}
