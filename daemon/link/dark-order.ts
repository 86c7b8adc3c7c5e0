import { seal } from "../../firmware-protocol/line.ts";
import { STATUS } from "../model/sample.ts";
import type { LinkQueue } from "./queue.ts";
import { Waiter } from "./waiter.ts";

/** Pause between two darks while no sample comes that could carry the repeat. */
const DARK_PAUSE_ms = 100;
/** Repeats without a sample before that is told; samples go on repeating it after that. */
const DARK_REPEATS_MAX = 50;

const LIT = STATUS.emitting | STATUS.armed;

/**
 * One ordered dark, until a sample shows it done. It goes before every other line, takes queued
 * permits and arm lines away with it, and is repeated with each sample and each pause.
 */
export class DarkOrder {
  /** Cause code of the order that stands, or −1. */
  code = -1;
  private repeats = 0;
  private readonly waiter = new Waiter();
  private readonly queue: LinkQueue;

  constructor(queue: LinkQueue) {
    this.queue = queue;
  }

  get standing(): boolean {
    return this.code >= 0;
  }

  clear(): void {
    this.code = -1;
    this.waiter.end();
  }

  /** A person's 0 never replaces a cause that is already being told: the first cause is kept. */
  order(code: number): void {
    if (this.code <= 0) this.code = code;
    this.repeats = 0;
    this.queue.purge("light");
    this.send();
  }

  /** A sample arrived: done, or once more. */
  sample(status: number, cause: number): void {
    if (this.code < 0) return;
    if ((status & LIT) !== 0) {
      this.send();
      return;
    }
    this.clear();
    this.queue.fact("dark-confirmed", cause, "");
  }

  elapse(now: number): void {
    if (!this.waiter.expired(now)) return;
    this.repeats += 1;
    if (this.repeats < DARK_REPEATS_MAX) {
      this.send();
      return;
    }
    this.waiter.end();
    this.queue.fact("no-answer", this.repeats, "dark");
  }

  next(): number {
    return this.waiter.next();
  }

  private send(): void {
    this.queue.purge("dark");
    this.waiter.begin("dark", DARK_PAUSE_ms);
    this.queue.send(seal(`>dark ${this.code}`), "dark");
  }
}
