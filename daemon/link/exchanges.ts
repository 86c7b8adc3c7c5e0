import { armAnswer } from "../../firmware-protocol/answer.ts";
import { seal } from "../../firmware-protocol/line.ts";
import type { FieldsOf } from "../../firmware-protocol/messages.ts";
import { reasonCode, reasonWords } from "../../firmware-protocol/reasons.ts";
import type { Manifest } from "../model/manifest.ts";
import { ANSWER_ms } from "./curve-load.ts";
import type { LinkQueue } from "./queue.ts";
import { Waiter } from "./waiter.ts";

/** Exchanges begun by an order: opening a session, clearing the latch, asking for counters. One attempt each. */
export class Exchanges {
  /** Token of the open session, or null. Every permit carries it. */
  token: string | null = null;
  /** The board's own counters, as `status` last brought them. */
  boardCounts: FieldsOf<"counts"> | null = null;
  /** "ask" until the offer, then "arm" until the answer to the answer. */
  private readonly arming = new Waiter();
  private readonly resetting = new Waiter();
  private readonly counting = new Waiter();
  private readonly queue: LinkQueue;

  constructor(queue: LinkQueue) {
    this.queue = queue;
  }

  clear(): void {
    this.endSession();
    this.resetting.end();
    this.counting.end();
  }

  /** No permit counts any more, and no arming goes on. */
  endSession(): void {
    this.token = null;
    this.arming.end();
  }

  get isArming(): boolean {
    return this.arming.waiting;
  }

  arm(): void {
    this.token = null;
    this.arming.begin("ask", ANSWER_ms);
    this.queue.send(seal(">ask arm"), "light");
  }

  reset(cause: number): void {
    this.resetting.begin("reset", ANSWER_ms);
    this.queue.send(seal(`>reset ${cause}`), "plain");
  }

  status(): void {
    this.counting.begin("status", ANSWER_ms);
    this.queue.send(seal(">status"), "plain");
  }

  /** The board offered a number: the answer to it, or null where nobody asked for one. */
  offer(offer: FieldsOf<"offer">, manifest: Manifest, curveCrc: string): number | null {
    if (offer.purpose !== "arm" || this.arming.verb !== "ask") return null;
    this.arming.begin("arm", ANSWER_ms);
    return armAnswer({
      number: offer.number,
      boot: offer.boot,
      arms: offer.arms,
      curveCrc,
      absolute_counts: manifest.absolute_counts,
      term_ticks_min: manifest.term_ticks_min,
      term_ticks_max: manifest.term_ticks_max,
      protocol: manifest.protocol,
      firmware: manifest.firmware,
    });
  }

  counted(fields: FieldsOf<"counts">): void {
    this.boardCounts = fields;
    this.counting.end();
  }

  /** Whether a `yes` was waited for here. */
  accepted(fields: FieldsOf<"yes">): boolean {
    if (fields.verb === "arm" && this.arming.verb === "arm") {
      this.arming.end();
      this.token = fields.value;
      this.queue.fact("armed", 0, fields.value);
      return true;
    }
    if (fields.verb !== "reset" || !this.resetting.waiting) return false;
    this.resetting.end();
    this.queue.fact("reset-done", fields.value, "");
    return true;
  }

  /** Whether a `no` was waited for here. */
  refused({ verb, reason }: FieldsOf<"no">): boolean {
    if (verb === this.arming.verb) {
      this.arming.end();
      this.queue.fact("arm-refused", reasonCode(reason), reasonWords(reason));
      return true;
    }
    if (verb === this.resetting.verb) {
      this.resetting.end();
      this.queue.fact("reset-refused", reasonCode(reason), reasonWords(reason));
      return true;
    }
    if (verb !== this.counting.verb) return false;
    this.counting.end();
    return true;
  }

  /** Whether an answer to the arm line is overdue: the board may be armed without our knowing. */
  elapse(now: number): boolean {
    const doubt = this.arming.verb === "arm" && this.arming.expired(now);
    this.giveUp(this.arming, now);
    this.giveUp(this.resetting, now);
    this.giveUp(this.counting, now);
    return doubt;
  }

  next(): number {
    return Math.min(this.arming.next(), this.resetting.next(), this.counting.next());
  }

  private giveUp(waiter: Waiter, now: number): void {
    if (!waiter.expired(now)) return;
    this.queue.fact("no-answer", 1, waiter.verb);
    waiter.end();
  }
}
