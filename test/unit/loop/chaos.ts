import { makeCurve } from "../../../daemon/bench-file/curve.ts";
import { Chance } from "../../../daemon/bench-sim/chance.ts";
import { NORTH_CHANNELS } from "../../../daemon/bench-sim/converters.ts";
import { North } from "../../../daemon/bench-sim/north.ts";
import { STATES } from "../../../daemon/judge/records.ts";
import { Asking } from "../../../daemon/loop/asking.ts";
import { Loop, type Received } from "../../../daemon/loop/loop.ts";
import { causeOf } from "../../../daemon/model/cause.ts";
import type { StoredLatch } from "../../../daemon/model/record-messages.ts";
import { Ring, ringBytes } from "../../../daemon/model/ring.ts";
import { type Mono_ms, mono, wall } from "../../../daemon/model/times.ts";
import { latchAfter } from "../../../daemon/record/latch.ts";
import { controllerCore, north } from "./bench.ts";
import { Oracle } from "./chaos-oracle.ts";
import { WIRE_FAULTS, Wire, type WireFault } from "./chaos-wire.ts";

/** What this rig does to a case reading, counts in, counts out. */
type Tamper = (counts: number) => number;
/** Stands where no fault does. */
const NOTHING = (): void => {};
const asItIs: Tamper = (counts) => counts;

/** How long a fault lasts and how long all is well between two, ms: light needs about 7 s to come. */
const FAULT_ms = { min: 20, max: 1800 };
const STALL_ms = { min: 5, max: 2500 };
const CALM_ms = { min: 200, max: 14_000 };

/**
 * Board, link and judge with everything that can happen to them, by one seed: a wire that damages
 * both directions, a host that stands still, dies or finds its clock moved, a board that is reset,
 * a cable that is pulled, sensors, key and loop, and people who ask at random. An oracle looks at
 * the diode after every millisecond.
 */
export class Chaos {
  readonly oracle = new Oracle();
  readonly board: North;
  readonly down: Wire;
  readonly up: Wire;
  loop: Loop;
  now_ms = 0;
  readonly #chance: Chance;
  readonly #tick0: number;
  #asking: Asking;
  #latch: StoredLatch | null = null;
  #clockOff_ms = 0;
  #stalledUntil_ms = 0;
  #plugged = false;
  #fault_ms = 0;
  #heal: () => void = NOTHING;
  #case: Tamper = asItIs;
  /** An adapter that echoes, or crossed wires: each side hears itself as well. */
  #echoes = false;
  #sent = "";
  #arrived = "";
  #pending: Received[] = [];

  constructor(seed: number) {
    this.#chance = new Chance(seed);
    this.#tick0 = seed % 3 === 0 ? 0xffff_ffff - 20_000 : 0;
    this.down = new Wire(this.#chance);
    this.up = new Wire(this.#chance);
    this.board = new North({
      bench: north,
      module: controllerCore,
      seed: seed + 1,
      rate_perS: 50,
      pass_ms: 1,
      tick: this.#tick0,
    });
    this.board.onBytes = (bytes) => this.#fromBoard(bytes);
    this.board.tamper = (values) => {
      const counts = this.#case(values[NORTH_CHANNELS.case] ?? 0);
      values[NORTH_CHANNELS.case] = Math.max(0, Math.min(16_383, Math.round(counts)));
      this.oracle.reads(values[NORTH_CHANNELS.case] ?? 0);
    };
    [this.loop, this.#asking] = this.#host();
    this.plug();
    this.#fault_ms = this.#between(CALM_ms);
  }

  /** Lets time pass with faults and people. */
  run(ms: number): void {
    for (let i = 0; i < ms; i++) {
      if (this.now_ms >= this.#fault_ms) this.#turn();
      // Misfortunes do not wait for each other.
      if (this.#heal !== NOTHING && this.#chance.uniform() < 0.0004) this.#blow();
      this.#people();
      this.#step();
    }
  }

  /** All faults end, nobody asks for anything, and time passes: both sides must agree again. */
  settle(ms: number): void {
    this.#mend();
    this.#stalledUntil_ms = 0;
    if (!this.#plugged) this.plug();
    for (let i = 0; i < ms; i++) this.#step();
  }

  /** Called in every millisecond: what a canary does wrong. */
  protected sabotage(): void {}

  get state(): string {
    return STATES[this.loop.out.view.state] ?? "?";
  }

  get cause(): string {
    return causeOf(this.loop.out.view.cause).id;
  }

  plug(): void {
    this.#plugged = true;
    this.loop.opened(this.hostNow());
  }

  unplug(): void {
    this.#plugged = false;
    this.down.cut();
    this.up.cut();
    this.#arrived = "";
    this.#pending = [];
    this.loop.closed(this.hostNow(), "the cable is out");
  }

  hostNow(): Mono_ms {
    return mono(this.now_ms + this.#clockOff_ms);
  }

  get tick(): number {
    return (this.#tick0 + this.now_ms) >>> 0;
  }

  #host(): [Loop, Asking] {
    const loop = new Loop(
      north,
      {
        now: () => this.hostNow(),
        wall: () => wall(Date.UTC(2026, 0, 10, 20) + this.now_ms),
        write: (line) => this.write(line),
        drained: () => this.down.isDrained,
        record: () => {},
        event: (_line, event) => {
          this.oracle.event(event);
          this.#latch = latchAfter(this.#latch, event, "NORTH-1") ?? this.#latch;
        },
        curve: makeCurve,
      },
      new Ring(new SharedArrayBuffer(ringBytes(60))),
      this.#latch,
    );
    const asking = new Asking(loop);
    loop.onStep = () => asking.settle(this.hostNow());
    return [loop, asking];
  }

  /** A line of the host goes onto the wire. */
  write(line: string): boolean {
    this.oracle.hostWrites(line.trimEnd());
    if (!this.#plugged) return false;
    const bytes = new TextEncoder().encode(line);
    this.down.put(bytes, this.now_ms);
    if (this.#echoes) this.up.put(bytes, this.now_ms);
    return true;
  }

  #fromBoard(bytes: Uint8Array): void {
    this.#sent += String.fromCharCode(...bytes);
    const lines = this.#sent.split("\n");
    this.#sent = lines.pop() ?? "";
    for (const line of lines) this.oracle.boardSends(line.replace(/ [0-9A-F]{4}\r?$/, ""));
    if (!this.#plugged) return;
    this.up.put(bytes, this.now_ms);
    if (this.#echoes) this.down.put(bytes, this.now_ms);
  }

  #step(): void {
    this.now_ms++;
    for (const bytes of this.down.take(this.now_ms)) {
      this.oracle.reachesBoard(bytes, this.tick);
      this.board.write(bytes);
    }
    this.board.advance(this.now_ms);
    for (const bytes of this.up.take(this.now_ms)) this.#arrive(bytes);
    const runs = this.now_ms >= this.#stalledUntil_ms;
    if (runs) this.#hostRuns();
    this.sabotage();
    this.oracle.look({
      tick: this.tick,
      drive_counts: this.board.controller.enabled ? this.board.controller.drive_counts : 0,
      current_mA: this.board.plant.current_mA,
      key: this.board.hands.key,
      loop: this.board.hands.loop,
      hostState: this.state,
      hostCause: this.cause,
      hostRuns: runs,
    });
  }

  /** Bytes reach the computer; they wait in its buffers while the host stands still. */
  #arrive(bytes: Uint8Array): void {
    this.#arrived += String.fromCharCode(...bytes);
    const lines = this.#arrived.split("\n");
    this.#arrived = (lines.pop() ?? "").slice(-4096);
    for (const line of lines) this.#pending.push({ line, at: this.hostNow() });
  }

  #hostRuns(): void {
    const at = this.hostNow();
    const lines = this.#pending.map(({ line }) => ({ line, at }));
    this.#pending = [];
    // After a stall either may come first: what was read, or the deadline that passed meanwhile.
    const late = this.#chance.uniform() < 0.5;
    if (late) this.#elapse(at);
    if (lines.length > 0) {
      this.oracle.fedTo(lines.map(({ line }) => line));
      this.oracle.judging = true;
      this.loop.receive(lines);
      this.oracle.judging = false;
    }
    if (!late) this.#elapse(at);
    this.#asking.settle(at);
  }

  #elapse(at: Mono_ms): void {
    if (at >= this.loop.nextDeadline()) this.loop.elapse(at);
  }

  #people(): void {
    if (this.now_ms < this.#stalledUntil_ms) return;
    const chance = this.#chance.uniform();
    const { state } = this;
    if (state === "standby" && chance < 0.004) this.#ask("arm");
    else if (state === "tripped" && chance < 0.004) this.#ask("reset");
    else if ((state === "emitting" || state === "armed") && chance < 0.0006) this.#ask("set");
    else if (chance > 0.9999) this.#ask("dark");
    else if (chance > 0.9996) this.#ask(this.#pick(["arm", "set", "reset"] as const));
  }

  #ask(verb: "arm" | "set" | "dark" | "reset"): void {
    const current_mA = Math.round(this.#chance.uniform() * 2000);
    const asker = "person" as const;
    this.oracle.asked(verb, current_mA);
    const request =
      verb === "dark"
        ? ({ id: 1, verb, asker } as const)
        : verb === "reset"
          ? ({ id: 1, verb, cause: this.cause, asker } as const)
          : ({ id: 1, verb, current_mA, asker } as const);
    this.#asking.ask(request, this.hostNow(), () => {});
  }

  /** A fault begins; where it is one that lasts, the next turn ends it. */
  #turn(): void {
    if (this.#heal !== NOTHING) {
      this.#mend();
      this.#fault_ms = this.now_ms + this.#between(CALM_ms);
      return;
    }
    const kind = this.#chance.uniform();
    if (kind < 0.45) this.#wireFault();
    else if (kind < 0.52) this.#pull();
    else if (kind < 0.62) this.#sensor();
    else if (kind < 0.7) this.#hands();
    else this.#blow();
    this.#fault_ms = this.now_ms + this.#between(this.#heal === NOTHING ? CALM_ms : FAULT_ms);
  }

  /** Something that happens in one moment. */
  #blow(): void {
    const kind = this.#chance.uniform();
    if (kind < 0.4) this.#stalledUntil_ms = this.now_ms + this.#between(STALL_ms);
    else if (kind < 0.8) this.#resetBoard();
    else if (kind < 0.9) this.#clockOff_ms += this.#between({ min: 1, max: 4000 });
    else this.#restartHost();
  }

  #mend(): void {
    this.#heal();
    this.#heal = NOTHING;
  }

  #wireFault(): void {
    const faults: readonly WireFault[] = WIRE_FAULTS;
    this.#echoes = this.#chance.uniform() < 0.1;
    const where = this.#chance.uniform();
    if (where < 0.7) this.down.become(this.#pick(faults));
    if (where > 0.4) this.up.become(this.#pick(faults));
    this.#heal = () => {
      this.down.become("clean");
      this.up.become("clean");
      this.#echoes = false;
    };
  }

  #resetBoard(): void {
    this.oracle.boots();
    this.board.controller.boot(
      this.#pick(["power", "brown-out", "watchdog", "external"] as const),
      this.tick,
    );
    if (this.#chance.uniform() < 0.2) {
      this.board.controller.receiveBreak();
      this.oracle.cuts();
    }
  }

  #pull(): void {
    this.unplug();
    this.#heal = () => this.plug();
  }

  /** A host that begins with this latch, and without a cable. */
  restoreFrom(latch: StoredLatch): void {
    this.#latch = latch;
    this.#plugged = false;
    [this.loop, this.#asking] = this.#host();
  }

  /** The host is killed and started again; what stands in the adapter's buffers arrives all the same. */
  #restartHost(): void {
    const plugged = this.#plugged;
    this.#arrived = "";
    this.#pending = [];
    this.#stalledUntil_ms = 0;
    [this.loop, this.#asking] = this.#host();
    if (plugged) this.plug();
  }

  #sensor(): void {
    const by = this.#between({ min: 0, max: 3000 });
    const frozen = 9000;
    this.#case = this.#pick<Tamper>([
      () => 16_383,
      () => 0,
      () => frozen,
      (counts) => counts - by,
      (counts) => counts + by,
      (counts) => (this.#chance.uniform() < 0.3 ? 16_383 : counts),
    ]);
    this.#heal = () => {
      this.#case = asItIs;
    };
  }

  #hands(): void {
    const { hands } = this.board;
    const hand = this.#pick(["key", "loop"] as const);
    hands[hand] = false;
    this.#heal = () => {
      hands[hand] = true;
    };
  }

  #between({ min, max }: { readonly min: number; readonly max: number }): number {
    return Math.round(min + this.#chance.uniform() * (max - min));
  }

  #pick<T>(from: readonly T[]): T {
    return from[Math.floor(this.#chance.uniform() * from.length)] as T;
  }
}
