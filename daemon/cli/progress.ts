import { setImmediate } from "node:timers/promises";
import type { Done, Work } from "../record/work.ts";
import { EXIT, Trouble } from "./say.ts";

/** Work that is over sooner is not talked about, ms. */
const QUIET_ms = 2000;
/** Pace of the line, ms. */
const PACE_ms = 200;
const BAR_CHARS = 24;

/**
 * How far a long piece of work is, on one line of stderr with the time that is left; nothing where
 * nobody watches, and nothing in the first two seconds.
 */
export class Progress {
  readonly #what: string;
  readonly #began = performance.now();
  #told_ms = Number.NEGATIVE_INFINITY;
  #shown = false;

  /** @param what the work, as the line names it: "Checking" */
  constructor(what: string) {
    this.#what = what;
  }

  tell({ done, total }: Done): void {
    const now = performance.now();
    if (!process.stderr.isTTY || total <= 0) return;
    if (now - this.#began < QUIET_ms || now - this.#told_ms < PACE_ms) return;
    this.#told_ms = now;
    this.#shown = true;
    process.stderr.write(`\r\u001b[2K${line(this.#what, done / total, now - this.#began)}`);
  }

  /** Takes the line away. */
  end(): void {
    if (this.#shown) process.stderr.write("\r\u001b[2K");
    this.#shown = false;
  }
}

/** One line: a bar, the part that is done, and the time left as the time so far tells it. */
export function line(what: string, part: number, elapsed_ms: number): string {
  const share = Math.min(1, Math.max(0, part));
  const full = Math.round(share * BAR_CHARS);
  const bar = `${"#".repeat(full)}${".".repeat(BAR_CHARS - full)}`;
  const left_s = share > 0 ? Math.round((elapsed_ms * (1 - share)) / share / 1000) : 0;
  const left = left_s >= 60 ? `${Math.floor(left_s / 60)} min ${left_s % 60} s` : `${left_s} s`;
  return `${what}  ${bar}  ${Math.floor(share * 100)} %  ${left} left`;
}

/** A signal that Ctrl-C or an ending terminal gives, for as long as `during` goes on. */
export async function interruptible<T>(during: (signal: AbortSignal) => Promise<T>): Promise<T> {
  const ending = new AbortController();
  const end = (): void =>
    ending.abort(new Trouble("Interrupted.", "Nothing half done was kept.", EXIT.refused));
  process.once("SIGINT", end);
  process.once("SIGTERM", end);
  try {
    return await during(ending.signal);
  } finally {
    process.off("SIGINT", end);
    process.off("SIGTERM", end);
  }
}

/** Drives work of this process to its end, with its progress told; Ctrl-C ends it cleanly. */
export function carryOut<T>(what: string, work: Work<T>): Promise<T> {
  const progress = new Progress(what);
  return interruptible(async (signal) => {
    try {
      for (;;) {
        const step = work.next();
        if (step.done === true) return step.value;
        progress.tell(step.value);
        // Lets a signal through.
        await setImmediate();
        signal.throwIfAborted();
      }
    } finally {
      progress.end();
      // Ended early: what was half done is taken back.
      work.return(undefined as T);
    }
  });
}
