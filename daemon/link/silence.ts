import type { LinkQueue } from "./queue.ts";

/** Sample periods without a good line that are told as silence. */
const SILENT_PERIODS = 3;
/** Shorter silences are the host's own scheduling, at any sample rate. */
const SILENCE_ms_MIN = 50;
/** Broken lines are told at most once in this time, with how many there were. */
const GARBLED_PAUSE_ms = 1000;

/** Tells when good lines stop and come again, and how many broken ones came. */
export class Silence {
  private limit_ms = Number.POSITIVE_INFINITY;
  private last_ms = 0;
  private silent = false;
  private bad = 0;
  private badKind = "";
  private badTold_ms = Number.NEGATIVE_INFINITY;
  private readonly queue: LinkQueue;

  constructor(queue: LinkQueue) {
    this.queue = queue;
  }

  /** Nobody is expected to speak. */
  clear(): void {
    this.limit_ms = Number.POSITIVE_INFINITY;
    this.silent = false;
    this.bad = 0;
    this.badTold_ms = Number.NEGATIVE_INFINITY;
  }

  /** From now on samples are expected at that rate. */
  expect(rate_perS: number, now: number): void {
    this.limit_ms = Math.max(SILENCE_ms_MIN, (SILENT_PERIODS * 1000) / rate_perS);
    this.last_ms = now;
    this.silent = false;
  }

  goodLine(now: number): void {
    if (this.silent) this.queue.fact("back", now - this.last_ms, "");
    this.silent = false;
    this.last_ms = now;
  }

  badLine(kind: string, now: number): void {
    this.bad += 1;
    this.badKind = kind;
    this.tellBad(now);
  }

  elapse(now: number): void {
    if (this.bad > 0) this.tellBad(now);
    if (this.silent || now - this.last_ms < this.limit_ms) return;
    this.silent = true;
    this.queue.fact("silence", now - this.last_ms, "");
  }

  next(): number {
    const quiet = this.silent ? Number.POSITIVE_INFINITY : this.last_ms + this.limit_ms;
    return this.bad > 0 ? Math.min(quiet, this.badTold_ms + GARBLED_PAUSE_ms) : quiet;
  }

  private tellBad(now: number): void {
    if (now < this.badTold_ms + GARBLED_PAUSE_ms) return;
    this.queue.fact("garbled", this.bad, this.badKind);
    this.bad = 0;
    this.badTold_ms = now;
  }
}
