import { isLit } from "../judge/cut.ts";
import { compilePlan, type Plan } from "../judge/plan.ts";
import {
  ASKERS,
  type Asker,
  INPUT,
  type Input,
  ORDER,
  type Out,
  REQUESTS,
  type RequestName,
} from "../judge/records.ts";
import { newInput, newOut, newState, PENDING, restoreLatch, type State } from "../judge/state.ts";
import { step } from "../judge/step.ts";
import { brokenLines } from "../link/counts.ts";
import { PlainSession } from "../link/plain/session.ts";
import type { CurvePoints } from "../link/session.ts";
import type { Bench } from "../model/bench.ts";
import { LINK_FACTS, type LinkFact } from "../model/link-fact.ts";
import type { Manifest } from "../model/manifest.ts";
import type { StoredLatch } from "../model/record-messages.ts";
import type { Ring } from "../model/ring.ts";
import type { Mono_ms } from "../model/times.ts";
import type { LoopPorts } from "./ports.ts";
import { writeRow } from "./row.ts";
import { type Session, sessionFor } from "./sessions.ts";
import { Telling } from "./telling.ts";

/** One received line and the moment it was read. */
export interface Received {
  readonly line: string;
  readonly at: Mono_ms;
}

/**
 * The loop: what comes in from the wire and from people goes through the link and the judge, and
 * what the judge orders goes out. The same class runs live, in the demo and in a campaign; it reads
 * no clock of its own and waits for nobody.
 *
 * A sample comes in at `receive`, is judged in `#judge`, and light is cut in `#carryOut`, first line.
 */
export class Loop {
  readonly session: Session;
  readonly state: State;
  readonly out: Out;
  readonly telling: Telling;
  bench: Bench;
  plan: Plan | null = null;
  /** What stands between this bench file and this controller; empty where nothing does. */
  problems: readonly string[] = [];
  /** Called after every step, while its outcome stands in `out`. */
  onStep: () => void = () => {};
  /** Monotonic time of the last sample, or −Infinity. */
  lastSample_ms = Number.NEGATIVE_INFINITY;
  readonly #ports: LoopPorts;
  readonly #ring: Ring;
  readonly #input: Input;
  #inputs = 0;
  /** Broken lines counted when the port opened. */
  #brokenAtOpen = 0;
  /** Set by a defect of ours: what is judged from then on cannot be trusted, so nothing is. */
  #defect = false;
  /** Rows of the ring written so far; the recorder finds by it where a manifest begins. */
  #rows = 0;

  constructor(bench: Bench, ports: LoopPorts, ring: Ring, latch: StoredLatch | null) {
    this.bench = bench;
    this.#ports = ports;
    this.#ring = ring;
    this.#input = newInput();
    this.out = newOut();
    this.state = newState();
    if (latch !== null) restoreLatch(this.state, latch.cause, latch.lit);
    // Shown from the start: without a port it may be long until the first step.
    this.out.view.state = this.state.state;
    this.out.view.cause = this.state.cause;
    const serial = latch !== null && latch.serial !== "" ? latch.serial : bench.controller.serial;
    this.session = sessionFor(bench, serial, (manifest) => this.#curveFor(manifest));
    this.telling = new Telling(bench.name, ports);
  }

  /** The port is open: the link begins to ask who is there. */
  opened(now: Mono_ms): void {
    this.#brokenAtOpen = brokenLines(this.session.counts);
    this.session.connected(now);
    this.#drainLink(now);
  }

  /** Lines that could not be read since the port opened. */
  get brokenSinceOpen(): number {
    return brokenLines(this.session.counts) - this.#brokenAtOpen;
  }

  /** The port is gone, and why. */
  closed(now: Mono_ms, why: string): void {
    this.session.disconnected(now, why);
    this.#drainLink(now);
  }

  /**
   * Lines as they were read, oldest first. All are judged; only the newest sample may earn a permit,
   * so that a stall ends in one permit for what is true now.
   */
  receive(lines: readonly Received[]): void {
    if (this.#defect) return;
    let newest = -1;
    for (let i = lines.length - 1; i >= 0 && newest < 0; i--) {
      if (this.session.brings(lines[i]?.line ?? "")) newest = i;
    }
    for (let i = 0; i < lines.length; i++) {
      const received = lines[i];
      if (received === undefined) continue;
      this.#input.newest = i === newest ? 1 : 0;
      this.session.feed(received.line, received.at);
      this.#drainLink(received.at);
    }
    this.#input.newest = 0;
  }

  /** Time has come to one of the deadlines of link or judge. */
  elapse(now: Mono_ms): void {
    if (this.#defect) return;
    this.session.elapse(now);
    this.#drainLink(now);
    if (now >= this.out.deadline_ms) {
      this.#begin(INPUT.deadline, now);
      this.#judge();
    }
  }

  /** When `elapse` wants to be called next; Infinity where nothing is due. */
  nextDeadline(): number {
    return Math.min(this.session.nextDeadline(), this.out.deadline_ms);
  }

  /** A request of a person or program; the judge's answer stands in `out` when this returns. */
  request(name: RequestName, value: number, asker: Asker, requestId: number, now: Mono_ms): void {
    this.#begin(INPUT.request, now);
    this.#input.request = REQUESTS.indexOf(name);
    this.#input.asker = ASKERS.indexOf(asker);
    this.#input.requestId = requestId;
    this.#input.value = value;
    this.#judge();
    this.#drainLink(now);
  }

  /** Dark past the judge, and then nothing more: the last act after a defect of ours. */
  emergency(cause: number): void {
    this.#defect = true;
    this.session.dark(cause);
    this.#putLevel();
    this.#sendQueued();
  }

  /**
   * Whether a changed bench file may be taken into use: the bench is dark, and nobody is arming it.
   * An arming under way is bound to the curve the board holds now; the board would light with that.
   */
  get mayAdopt(): boolean {
    return !isLit(this.state) && this.state.arming === PENDING.none;
  }

  /** Takes a changed bench file into use. Only while `mayAdopt`: the caller has seen to that. */
  adopt(bench: Bench, benchText: string, now: Mono_ms): void {
    this.bench = bench;
    this.#ports.record({ kind: "bench", ringRow: this.#rows, benchText });
    const manifest = this.session.manifest;
    if (manifest === null) return;
    const curve = this.#curveFor(manifest);
    this.#compile(manifest, curve);
    if (curve !== null) this.session.loadCurve(curve, now);
    this.#drainLink(now);
  }

  #curveFor(manifest: Manifest): CurvePoints | null {
    const made = this.#ports.curve(this.bench, manifest);
    if ("problems" in made) {
      this.problems = made.problems;
      this.plan = null;
      return null;
    }
    return made;
  }

  #compile(manifest: Manifest, curve: CurvePoints | null): void {
    if (curve === null) return;
    const compiled = compilePlan(this.bench, manifest, curve);
    this.plan = compiled.ok ? compiled.plan : null;
    this.problems = compiled.ok ? [] : compiled.problems;
  }

  #drainLink(now: Mono_ms): void {
    this.#putLevel();
    for (let item = this.session.take(); item !== null; item = this.session.take()) {
      switch (item.kind) {
        case "send":
          this.#ports.write(item.line);
          break;
        case "sample":
          this.#sample(item.receivedAt);
          break;
        case "fact":
          this.#fact(item.fact, item.value, item.text, now);
          break;
        default:
          item satisfies never;
      }
    }
  }

  #sample(at: Mono_ms): void {
    this.lastSample_ms = at;
    this.#begin(INPUT.sample, at);
    const input = this.#input;
    input.sample = this.session.sample;
    input.drift = this.session.clock.drift;
    input.jump_ms = this.session.clock.jump_ms;
    input.portDrained = this.#ports.drained() ? 1 : 0;
    this.#judge();
    if (this.session.manifest !== null) {
      writeRow(this.#ring, input, this.out.view, this.#ports.wall());
      this.#rows++;
    }
  }

  #fact(fact: LinkFact, value: number, text: string, now: Mono_ms): void {
    if (fact === "introduced" && this.session.manifest !== null) this.#introduced();
    this.#begin(INPUT.link, now);
    this.#input.fact = LINK_FACTS.indexOf(fact);
    this.#input.factValue = value;
    this.telling.link(fact, value, text, this.#input);
    this.#judge();
  }

  #introduced(): void {
    const manifest = this.session.manifest;
    if (manifest === null) return;
    this.#ports.record({ kind: "manifest", ringRow: this.#rows, manifest });
    this.#compile(manifest, this.#curveFor(manifest));
    if (this.problems.length > 0) {
      this.telling.say("link", "bench-file", this.problems.join(" "), "warn", null, 0, 0);
    }
  }

  #begin(kind: number, now: Mono_ms): void {
    const input = this.#input;
    input.n = ++this.#inputs;
    input.kind = kind;
    input.now_ms = now;
    input.request = 0;
    input.asker = 0;
    input.requestId = 0;
    input.value = 0;
    input.fact = 0;
    input.factValue = 0;
  }

  #judge(): void {
    const input = this.#input;
    if (input.kind !== INPUT.sample) this.telling.journal(input);
    step(this.plan, this.state, input, this.out);
    this.#carryOut(this.out);
    this.telling.outcome(this.out, input, this.#rows, this.session.manifest);
    this.onStep();
  }

  /** Dark first, then at most one permit, then an exchange. Nothing else here can raise current. */
  #carryOut(out: Out): void {
    if (out.dark >= 0) {
      this.session.dark(out.dark);
      this.#sendQueued();
    } else if (out.permit === 1) {
      this.session.permit(out.permitSeq, out.cap_counts, out.aim_counts, out.term_ticks);
      this.#sendQueued();
    }
    if (out.order === ORDER.arm) this.session.arm();
    else if (out.order === ORDER.reset) this.session.reset(out.orderValue);
    this.#putLevel();
  }

  /** A modem line that cuts takes its level before anything else leaves. */
  #putLevel(): void {
    if (!(this.session instanceof PlainSession)) return;
    const order = this.session.takeLevel();
    if (order !== null) this.#ports.level?.(order);
  }

  /** Lines of the link leave at once; samples and facts wait for their turn in `#drainLink`. */
  #sendQueued(): void {
    for (let line = this.session.takeLine(); line !== null; line = this.session.takeLine()) {
      this.#ports.write(line);
    }
  }
}
