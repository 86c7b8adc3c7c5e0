import { closeSync, constants, fstatSync, openSync, write } from "node:fs";
import type { EventLine } from "../control/api.ts";
import { codeOf, terminalColumns, wrapped } from "./say.ts";

/** Lines kept while nobody takes them: a stopped terminal may be let go again. */
const WAITING_LINES_MAX = 500;
/** Pause before a full terminal or pipe is tried again, ms. */
const AGAIN_ms = 100;

/**
 * Standard output of a running daemon. A terminal that was stopped (Ctrl-S, a hung connection, a
 * reader that sleeps) would hold an ordinary write, and with it the judging thread, until light goes
 * out; so the daemon writes through a description of its own that never waits. What cannot be shown
 * in time is left out and counted.
 */
export class Terminal {
  readonly #handle: number;
  #waiting: string[] = [];
  #rest: Buffer | null = null;
  #busy = false;
  #gone = false;
  #leftOut = 0;

  constructor() {
    this.#handle = ownHandle();
  }

  /**
   * Shows one line, now or a little later; never waits, never throws.
   * @param indent with what a line begins that was broken for a narrow terminal
   */
  line(text: string, indent = ""): void {
    if (this.#gone) return;
    if (this.#waiting.length >= WAITING_LINES_MAX) this.#leftOut++;
    else this.#waiting.push(`${wrapped(text, terminalColumns(), indent)}\n`);
    this.#next();
  }

  /** Whether everything was shown, or nobody is there to see it. */
  get isDone(): boolean {
    return this.#gone || (!this.#busy && this.#rest === null && this.#waiting.length === 0);
  }

  close(): void {
    this.#gone = true;
    if (this.#handle !== 1) closeSync(this.#handle);
  }

  #next(): void {
    if (this.#busy || this.#gone) return;
    if (this.#rest === null) {
      if (this.#waiting.length === 0) return;
      if (this.#leftOut > 0) this.#waiting.push(`${this.#leftOut} lines could not be shown.\n`);
      this.#leftOut = 0;
      this.#rest = Buffer.from(this.#waiting.join(""));
      this.#waiting = [];
    }
    this.#busy = true;
    write(this.#handle, this.#rest, (error, written) => this.#wrote(error, written));
  }

  #wrote(error: NodeJS.ErrnoException | null, written: number): void {
    this.#busy = false;
    if (error !== null && codeOf(error) !== "EAGAIN") {
      // The terminal or the reader is gone. The record has everything; the judge goes on.
      this.#gone = true;
      return;
    }
    const rest = this.#rest?.subarray(error === null ? written : 0) ?? null;
    this.#rest = rest === null || rest.length === 0 ? null : rest;
    if (error === null) this.#next();
    else setTimeout(() => this.#next(), AGAIN_ms).unref();
  }
}

/** A description of standard output that does not wait, where the system gives one. */
function ownHandle(): number {
  try {
    // A file never makes a writer wait for a reader, and only the shared description keeps the place
    // where the next program of a script goes on: appended lines would be written over.
    if (fstatSync(1).isFile()) return 1;
    const flags = constants.O_WRONLY | constants.O_APPEND | constants.O_NONBLOCK;
    return openSync("/proc/self/fd/1", flags);
  } catch {
    // A socket (a service's log), or no /proc: written to as it is, off the judging thread.
    return 1;
  }
}

/** Where the words of an event begin. */
export const EVENT_INDENT = " ".repeat(16);

/** One event as one line: local time, what it weighs where it is not calm, and the words. */
export function eventText({ at, weight, words }: EventLine): string {
  const mark = weight === "calm" ? "    " : weight;
  return `${clock(at)}  ${mark}  ${words}`;
}

/** Local time of day, to the second. */
export function clock(wall_ms: number): string {
  const at = new Date(wall_ms);
  const two = (n: number): string => String(n).padStart(2, "0");
  return `${two(at.getHours())}:${two(at.getMinutes())}:${two(at.getSeconds())}`;
}
