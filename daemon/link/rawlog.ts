import type { Mono_ms } from "../model/times.ts";

/** Raw lines kept of both directions together. */
export const LINES_KEPT = 1000;
/** Bad lines kept. A wire that makes more of them tells nothing new with each. */
export const BAD_LINES_KEPT = 1000;

export interface RawLine {
  readonly at: Mono_ms;
  /** `in` from the board, `out` to it. */
  readonly way: "in" | "out";
  readonly line: string;
  /** How the line is broken; empty for a good one. */
  readonly broken: string;
}

/** A ring of lines. Writing one stores references and allocates nothing once it is full. */
class LineRing {
  private readonly capacity: number;
  private readonly at: Float64Array;
  private readonly out: Uint8Array;
  private readonly lines: string[] = [];
  private readonly broken: string[] = [];
  private written = 0;

  constructor(capacity: number) {
    this.capacity = capacity;
    this.at = new Float64Array(capacity);
    this.out = new Uint8Array(capacity);
  }

  push(at: number, out: 0 | 1, line: string, broken: string): void {
    const slot = this.written % this.capacity;
    this.at[slot] = at;
    this.out[slot] = out;
    this.lines[slot] = line;
    this.broken[slot] = broken;
    this.written += 1;
  }

  /** Marks the newest line as broken. */
  markNewest(broken: string): void {
    if (this.written > 0) this.broken[(this.written - 1) % this.capacity] = broken;
  }

  /** Oldest first. */
  list(): RawLine[] {
    const kept = Math.min(this.written, this.capacity);
    return Array.from({ length: kept }, (_, i): RawLine => {
      const slot = (this.written - kept + i) % this.capacity;
      return {
        at: (this.at[slot] ?? 0) as Mono_ms,
        way: this.out[slot] === 1 ? "out" : "in",
        line: this.lines[slot] ?? "",
        broken: this.broken[slot] ?? "",
      };
    });
  }

  /** Lines that were written and are no longer kept. */
  get dropped(): number {
    return Math.max(0, this.written - this.capacity);
  }
}

/** The last lines of both directions, and the last bad ones beside them, for a person to read. */
export class RawLog {
  private readonly all = new LineRing(LINES_KEPT);
  private readonly bad = new LineRing(BAD_LINES_KEPT);

  received(line: string, now: number): void {
    this.all.push(now, 0, line, "");
  }

  /** The line received last turned out to be broken. */
  wasBroken(line: string, broken: string, now: number): void {
    this.all.markNewest(broken);
    this.bad.push(now, 0, line, broken);
  }

  sent(line: string, now: number): void {
    this.all.push(now, 1, line, "");
  }

  /** At most `LINES_KEPT` lines, oldest first. */
  lines(): RawLine[] {
    return this.all.list();
  }

  /** The same in words: seconds of the monotonic clock, direction, line, and how it is broken. */
  words(): string[] {
    return this.lines().map(({ at, way, line, broken }) => {
      const seconds = (at / 1000).toFixed(3).padStart(10);
      return `${seconds} ${way.padEnd(3)} ${line}${broken === "" ? "" : `   (broken: ${broken})`}`;
    });
  }

  /** At most `BAD_LINES_KEPT` bad lines, oldest first, and how many older ones are gone. */
  badLines(): { readonly lines: RawLine[]; readonly dropped: number } {
    return { lines: this.bad.list(), dropped: this.bad.dropped };
  }
}
