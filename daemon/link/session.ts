import type { CurvePoints } from "../../firmware-protocol/answer.ts";
import { type BrokenKind, checkLine } from "../../firmware-protocol/line.ts";
import { type FieldsOf, type Message, readLine } from "../../firmware-protocol/messages.ts";
import { encodeArm, encodePermit } from "../../firmware-protocol/permit.ts";
import { reasonCode, reasonWords } from "../../firmware-protocol/reasons.ts";
import {
  decodeSampleInto,
  type SampleGroups,
  sampleGroups,
} from "../../firmware-protocol/sample.ts";
import type { Manifest } from "../model/manifest.ts";
import { newSample, type Sample, STATUS } from "../model/sample.ts";
import type { Mono_ms } from "../model/times.ts";
import { type LinkCounts, newCounts } from "./counts.ts";
import { CurveLoad } from "./curve-load.ts";
import { DarkOrder } from "./dark-order.ts";
import { Exchanges } from "./exchanges.ts";
import { Introduction, type IntroductionResult } from "./introduction.ts";
import { type LinkItem, LinkQueue } from "./queue.ts";
import { RawLog } from "./rawlog.ts";
import { Sequence } from "./sequence.ts";
import { Silence } from "./silence.ts";
import { takeOver } from "./take-over.ts";
import { TickClock } from "./tick-clock.ts";

export type { CurvePoints } from "../../firmware-protocol/answer.ts";
export type { LinkItem } from "./queue.ts";

export interface LinkOptions {
  /** Serial number the board must have; null takes the first one met and holds on to it. */
  readonly serial: string | null;
  /** The curve this board is to hold, or null where none can be made for it. */
  readonly curve: (manifest: Manifest) => CurvePoints | null;
}

/**
 * closed: no port. asking: the board is being asked who it is. introduced: known, without its curve.
 * loading: its curve is on the way. ready: it may be armed. stopped: asking has ended without a board
 * that can be used; a line that only a board sends starts it again.
 */
export type LinkPhase = "closed" | "asking" | "introduced" | "loading" | "ready" | "stopped";

const LIT = STATUS.armed | STATUS.emitting;

/**
 * The link to one board, without I/O: lines and moments go in, lines and happenings come out.
 *
 * Rules that everything leans on: a permit leaves only for the newest sample, within an open session
 * and while no dark stands; a dark takes queued permits and arm lines with it; nothing is queued for
 * a closed port. Call `take` until null after every other call: samples share one record.
 */
export class LinkSession {
  /** The newest sample, reused: valid until the next `feed`. */
  readonly sample: Sample = newSample();
  readonly counts: LinkCounts = newCounts();
  readonly clock = new TickClock();
  readonly log = new RawLog();
  readonly sequence = new Sequence();
  manifest: Manifest | null = null;
  phase: LinkPhase = "closed";
  private readonly options: LinkOptions;
  private serial: string | null;
  private readonly incoming: Sample = newSample();
  private groups: SampleGroups | null = null;
  private hasSample = false;
  private readonly queue: LinkQueue;
  private readonly introduction: Introduction;
  private readonly curve: CurveLoad;
  private readonly darkOrder: DarkOrder;
  private readonly silence: Silence;
  private readonly exchanges: Exchanges;

  constructor(options: LinkOptions) {
    this.options = options;
    this.serial = options.serial;
    this.queue = new LinkQueue(this.sample, this.counts, this.log);
    this.introduction = new Introduction(this.queue);
    this.curve = new CurveLoad(this.queue);
    this.darkOrder = new DarkOrder(this.queue);
    this.silence = new Silence(this.queue);
    this.exchanges = new Exchanges(this.queue);
  }

  /** The port opened. Its first lines may be torn and its board may just be booting: it is asked. */
  connected(now: Mono_ms): void {
    this.queue.at(now);
    this.forgetBoard();
    this.darkOrder.clear();
    this.queue.setOpen(true);
    this.counts.connections += 1;
    this.queue.fact("port-open", 0, "");
    this.introduce();
    this.elapse(now);
  }

  /** The port is gone. Everything queued is forgotten with it. @param why in words for a person */
  disconnected(now: Mono_ms, why: string): void {
    this.queue.at(now);
    this.forgetBoard();
    this.darkOrder.clear();
    this.introduction.stop();
    this.silence.clear();
    this.queue.setOpen(false);
    this.phase = "closed";
    this.queue.fact("port-closed", 0, why);
  }

  /** Whether a line brings a sample: only the newest one of a batch may earn a permit. */
  brings(line: string): boolean {
    return line.startsWith("<sample ");
  }

  /** One received line without its end, and when it was read. */
  feed(line: string, now: Mono_ms): void {
    if (this.phase === "closed") return;
    this.queue.at(now);
    this.counts.received += 1;
    this.log.received(line, now);
    if (line.startsWith("<sample ")) this.sampleLine(line, now);
    else this.otherLine(line, now);
    this.elapse(now);
  }

  /** Time passed: answers that are overdue, silences, repeats. */
  elapse(now: Mono_ms): void {
    if (this.phase === "closed") return;
    this.queue.at(now);
    if (this.introduction.elapse(now) === "stopped") this.phase = "stopped";
    this.curve.elapse(now);
    this.darkOrder.elapse(now);
    this.silence.elapse(now);
    // The board may have armed although its answer was lost: nobody may stay armed unasked.
    if (this.exchanges.elapse(now)) this.dark(0);
    this.settlePhase();
  }

  /** When `elapse` is wanted next; Infinity for never, in the past for at once. */
  nextDeadline(): Mono_ms {
    if (this.phase === "closed") return Number.POSITIVE_INFINITY as Mono_ms;
    return Math.min(
      this.introduction.next(),
      this.curve.next(),
      this.darkOrder.next(),
      this.silence.next(),
      this.exchanges.next(),
    ) as Mono_ms;
  }

  /** The next line or happening, or null. An item is valid until the next call. */
  take(): LinkItem | null {
    return this.queue.take();
  }

  /** The next line to write, with its end, or null: for lines that must not wait their turn. */
  takeLine(): string | null {
    return this.queue.takeLine()?.line ?? null;
  }

  /**
   * Permits light for the sample just judged. Dropped, and told, where no session is open, a dark
   * stands, or `n` is not the newest sample or no anchor.
   */
  permit(n: number, cap_counts: number, aim_counts: number, term_ticks: number): void {
    const { token } = this.exchanges;
    if (token === null || this.darkOrder.standing) {
      this.queue.fact("permit-refused", reasonCode("session"), "no session is open; not sent");
      return;
    }
    if (!this.hasSample || this.sample.seq !== n || (this.sample.status & STATUS.anchor) === 0) {
      this.queue.fact("anchor-missing", n, "the permit was not sent");
      return;
    }
    this.counts.permits += 1;
    this.queue.purge("light");
    this.queue.send(encodePermit(token, n, cap_counts, aim_counts, term_ticks), "light");
  }

  /** Cuts light, at once, whatever else goes on. @param code 0 for a person, else a host's cause */
  dark(code: number): void {
    this.exchanges.endSession();
    this.darkOrder.order(code);
  }

  /** Asks the board to clear its latch. @param cause the code being cleared, as the samples tell it */
  reset(cause: number): void {
    this.exchanges.reset(cause);
  }

  /** Begins the exchange that opens a session. One attempt; "armed", "arm-refused" or "no-answer" ends it. */
  arm(): void {
    if (this.phase !== "ready" || this.darkOrder.standing || this.exchanges.isArming) {
      const why =
        this.phase === "ready" ? "another order is under way" : `the link is ${this.phase}`;
      this.queue.fact("arm-refused", reasonCode("state"), why);
      return;
    }
    this.exchanges.arm();
  }

  /** Names another curve for the board to hold; loaded as soon as it is in standby. */
  loadCurve(points: CurvePoints, now: Mono_ms): void {
    if (this.manifest === null) return;
    this.queue.at(now);
    this.curve.want(points, this.manifest.absolute_counts);
    this.settlePhase();
  }

  /** Asks the board for its own counters; they arrive in `boardCounts`. */
  status(): void {
    this.exchanges.status();
  }

  /** The board's own counters, as `status` last brought them. */
  get boardCounts(): FieldsOf<"counts"> | null {
    return this.exchanges.boardCounts;
  }

  /** The last lines of both directions, oldest first, in words. */
  rawLines(): string[] {
    return this.log.words();
  }

  private forgetBoard(): void {
    this.hasSample = false;
    this.manifest = null;
    this.groups = null;
    this.exchanges.clear();
    this.curve.clear();
    this.silence.clear();
    this.sequence.clear();
    this.queue.purge("light");
  }

  private introduce(): void {
    this.phase = "asking";
    this.introduction.begin();
  }

  /** The board started anew: its session, its curve and its numbers are gone. */
  private boardReset(by: 1 | 2, text: string): void {
    this.counts.resets += 1;
    this.forgetBoard();
    this.queue.fact("board-reset", by, text);
    this.introduce();
  }

  private broken(kind: BrokenKind, line: string, now: number): void {
    this.counts[kind] += 1;
    if (kind === "empty") return;
    this.log.wasBroken(line, kind, now);
    this.silence.badLine(kind, now);
  }

  private sampleLine(line: string, now: Mono_ms): void {
    if (this.groups === null) {
      this.earlySample(line, now);
      return;
    }
    const { incoming, sequence } = this;
    const broken = decodeSampleInto(line, this.groups, incoming);
    if (broken !== null) {
      this.broken(broken, line, now);
      return;
    }
    this.silence.goodLine(now);
    const order = sequence.judge(incoming.seq, incoming.tick);
    if (order === "restarted") {
      this.boardReset(2, `sample ${incoming.seq} at tick ${incoming.tick} does not follow`);
    } else if (order === "duplicate" || order === "reordered") {
      this.counts[order] += 1;
      this.queue.fact(order, incoming.seq, "");
    } else this.accept(now);
  }

  /** Before the introduction is complete, samples cannot be read. They do show that a board is there. */
  private earlySample(line: string, now: Mono_ms): void {
    const broken = checkLine(line, "host");
    if (broken !== null) {
      this.broken(broken, line, now);
      return;
    }
    this.counts.early += 1;
    if (this.phase !== "stopped") this.introduction.hear();
    else if (this.introduction.canResume) this.introduce();
  }

  private accept(now: Mono_ms): void {
    const { incoming, sample, sequence } = this;
    if (sequence.lost > 0) {
      this.counts.lost += sequence.lost;
      this.queue.fact("lost", sequence.lost, "");
    }
    takeOver(incoming, sample, this.manifest?.channels.length ?? 0);
    this.hasSample = true;
    this.counts.samples += 1;
    this.clock.sample(sequence.tickTotal, now);
    const lit = (sample.status & LIT) !== 0;
    if (!lit) this.exchanges.token = null;
    this.darkOrder.sample(sample.status, sample.cause);
    if (!lit && (sample.status & STATUS.tripped) === 0) this.curve.standby();
    this.queue.sample(now);
  }

  private otherLine(line: string, now: Mono_ms): void {
    const message = readLine(line, "host");
    if (message.kind !== "message") {
      if (message.kind === "broken") this.broken(message.broken, line, now);
      return;
    }
    this.silence.goodLine(now);
    switch (message.verb) {
      case "boot":
        this.boardReset(1, `${message.fields.firmware}, after ${message.fields.cause}`);
        break;
      case "hello":
      case "channel":
      case "end":
        this.introductionResult(this.introduction.read(message, line), now);
        break;
      case "offer":
        this.answerOffer(message.fields);
        break;
      case "yes":
        this.accepted(message);
        break;
      case "no":
        this.refused(message, line, now);
        break;
      case "curve":
        this.curve.read(message);
        break;
      case "counts":
        this.exchanges.counted(message.fields);
        break;
      case "say":
        this.queue.fact("said", 0, message.fields.text);
        break;
      default:
        // Every verb that comes to a host is listed; the others were judged as broken.
        this.counts.unexpected += 1;
    }
  }

  private introductionResult(result: IntroductionResult, now: Mono_ms): void {
    if (result === "stopped") this.phase = "stopped";
    const { manifest } = this.introduction;
    if (result !== "introduced" || manifest === null) return;
    if (this.serial !== null && this.serial !== manifest.serial) {
      const text = `board ${manifest.serial} answered; ${this.serial} was expected`;
      this.queue.fact("board-changed", 0, text);
    }
    this.serial = manifest.serial;
    this.manifest = manifest;
    this.groups = sampleGroups(manifest);
    this.clock.clear(manifest.tick_us);
    this.sequence.clear();
    this.silence.expect(manifest.rate_perS, now);
    this.queue.fact("introduced", manifest.boot, "");
    this.phase = "introduced";
    this.curve.held = manifest.curveCrc;
    const points = this.options.curve(manifest);
    if (points !== null) this.curve.want(points, manifest.absolute_counts);
  }

  /** introduced, loading or ready, as the curve stands. */
  private settlePhase(): void {
    if (this.manifest === null) return;
    if (this.curve.settled) this.phase = "ready";
    else this.phase = this.curve.loading ? "loading" : "introduced";
  }

  private answerOffer(offer: FieldsOf<"offer">): void {
    const { manifest } = this;
    const answer =
      manifest === null ? null : this.exchanges.offer(offer, manifest, this.curve.held);
    if (answer === null) this.counts.unexpected += 1;
    else this.queue.send(encodeArm(answer), "light");
  }

  private accepted(message: Extract<Message, { verb: "yes" }>): void {
    if (this.exchanges.accepted(message.fields)) return;
    const { verb } = message.fields;
    if (verb === "stage" || verb === "point" || verb === "commit") this.curve.read(message);
    else if (verb !== "dark") this.counts.unexpected += 1;
  }

  private refused(message: Extract<Message, { verb: "no" }>, line: string, now: Mono_ms): void {
    const { verb, reason } = message.fields;
    if (this.exchanges.refused(message.fields)) return;
    if (verb === "who") this.introductionResult(this.introduction.read(message, line), now);
    else if (verb === "permit") {
      this.counts.permitsRefused += 1;
      this.queue.fact("permit-refused", reasonCode(reason), reasonWords(reason));
    } else this.curve.read(message);
  }
}
