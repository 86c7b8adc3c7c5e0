import { makeCurve } from "../../../daemon/bench-file/curve.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { STATES } from "../../../daemon/judge/records.ts";
import { Asking } from "../../../daemon/loop/asking.ts";
import { Loop } from "../../../daemon/loop/loop.ts";
import type { LoopAnswer } from "../../../daemon/loop/ports.ts";
import { snapshotOf } from "../../../daemon/loop/snapshot.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import type { BenchEvent } from "../../../daemon/model/event.ts";
import type { StoredLatch, ToRecorder } from "../../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import type { LevelOrder } from "../../../daemon/model/stream.ts";
import { mono, wall } from "../../../daemon/model/times.ts";

/** The rest of a bench file round a controller section: a diode alone. */
const REST = `
diode: { wavelength: 808 nm, threshold: 0.40 A, slope: 1.05 W/A, threshold-t0: 120 K, slope-t1: 350 K, absolute: 2.2 A }
limits: { current: 1.9 A }
derating:
  - { case: 28 °C, current: 2.10 A }
  - { case: 60 °C, current: 1.60 A }
hazards:
  case-over: { warn: 40 °C, warn-after: 1 s, trip: 45 °C, trip-after: 300 ms }
`;

export const STREAM = `
  rate: 10 /s
  stream:
    format: key-value
    columns:
      current: { from: I, unit: A }
      case: { from: T, unit: °C }`;

/** The bench of a file with this in its controller section; throws where it does not load. */
export function benchWith(controller: string, rest = REST): Bench {
  const parsed = parseBench(textWith(controller, rest));
  if (!parsed.ok) throw new Error(JSON.stringify(parsed.problems, null, 1));
  return parsed.bench;
}

export const textWith = (controller: string, rest = REST): string =>
  `bench: attic\ncontroller:\n  connect: { kind: serial, path: /dev/ttyUSB0, baud: 9600 baud }${controller}\n${rest}`;

/** A loop on a watched bench, with time by order and everything it does kept. */
export class Watched {
  readonly loop: Loop;
  readonly asking: Asking;
  readonly events: BenchEvent[] = [];
  readonly records: ToRecorder[] = [];
  readonly written: string[] = [];
  readonly levels: LevelOrder[] = [];
  now = 1000;

  constructor(bench: Bench, latch: StoredLatch | null = null) {
    this.loop = new Loop(
      bench,
      {
        now: () => mono(this.now),
        wall: () => wall(1_790_000_000_000 + this.now),
        write: (line) => this.written.push(line) > 0,
        level: (order) => this.levels.push(order),
        drained: () => true,
        record: (message) => this.records.push(message),
        event: (_line, event) => this.events.push(event),
        curve: makeCurve,
      },
      new Ring(new SharedArrayBuffer(ringBytes(600))),
      latch,
    );
    this.asking = new Asking(this.loop);
    this.loop.onStep = () => this.asking.settle(mono(this.now));
  }

  /** Opens the port and lets the torn first line pass. */
  open(): this {
    this.loop.opened(mono(this.now));
    return this.say("rn line");
  }

  /** Lines, each in its turn, `period_ms` apart. */
  say(line: string, times = 1, period_ms = 100): this {
    for (let i = 0; i < times; i++) {
      this.now += period_ms;
      if (this.now >= this.loop.nextDeadline()) this.loop.elapse(mono(this.now));
      this.loop.receive([{ line, at: mono(this.now) }]);
    }
    return this;
  }

  /** Time without a line. */
  wait(ms: number): this {
    const end = this.now + ms;
    while (this.now < end) {
      this.now += 10;
      if (this.now >= this.loop.nextDeadline()) this.loop.elapse(mono(this.now));
    }
    return this;
  }

  ask(verb: "arm" | "set" | "dark" | "reset", more: object = {}): LoopAnswer {
    let told: LoopAnswer = { ok: false, reason: "none came", words: "" };
    const request = { id: 1, verb, asker: "person", current_mA: 100, cause: "person", ...more };
    this.asking.ask(request as Parameters<Asking["ask"]>[0], mono(this.now), (a) => {
      told = a;
    });
    return told;
  }

  get state(): string {
    return STATES[this.loop.out.view.state] ?? "?";
  }

  kinds(): string[] {
    return this.events.map((e) => (e.hazard === "" ? e.kind : `${e.kind} ${e.hazard}`));
  }

  snapshot() {
    return snapshotOf(this.loop, {
      wall_ms: 0,
      now_ms: this.now,
      port: "",
      recorder: { behind_ms: 0, words: "" },
    });
  }
}
