import { Transform, type TransformCallback } from "node:stream";
import { LINE_BYTES_MAX } from "../../../firmware-protocol/line.ts";

/**
 * Bytes of a line that are passed on: the longest legal line, a carriage return, and one byte more,
 * by which whoever reads the line sees that it was too long.
 */
export const LINE_BYTES_PASSED = LINE_BYTES_MAX + 2;
const LF = 0x0a;

/**
 * Cuts over-long lines before anything gathers them: readers of lines keep everything up to the
 * next line end, without a limit. The head of such a line is passed on, the rest is dropped.
 */
export class LengthGuard {
  /** Bytes dropped since the start. */
  dropped = 0;
  private length = 0;
  private readonly bytes_max: number;

  constructor(bytes_max: number = LINE_BYTES_PASSED) {
    this.bytes_max = bytes_max;
  }

  /** What of a chunk may pass. The chunk itself is handed back where nothing is to be dropped. */
  pass(chunk: Uint8Array): Uint8Array {
    if (this.fits(chunk)) return chunk;
    const kept = new Uint8Array(chunk.length);
    let n = 0;
    for (const byte of chunk) {
      if (byte === LF) this.length = 0;
      else this.length += 1;
      if (this.length <= this.bytes_max) {
        kept[n] = byte;
        n += 1;
      } else this.dropped += 1;
    }
    return kept.subarray(0, n);
  }

  /** Whether the whole chunk may pass; counts it where it may. */
  private fits(chunk: Uint8Array): boolean {
    let { length } = this;
    for (const byte of chunk) {
      length = byte === LF ? 0 : length + 1;
      if (length > this.bytes_max) return false;
    }
    this.length = length;
    return true;
  }
}

/** The guard as a stream, to stand before a reader of lines. */
export class GuardStream extends Transform {
  readonly guard: LengthGuard;

  constructor(bytes_max?: number) {
    super();
    this.guard = new LengthGuard(bytes_max);
  }

  override _transform(chunk: Buffer, _: BufferEncoding, done: TransformCallback): void {
    const passed = this.guard.pass(chunk);
    done(null, passed.length === 0 ? undefined : passed);
  }
}

/** A line without the carriage return that may stand before its line feed. */
export const withoutReturn = (line: string): string =>
  line.endsWith("\r") ? line.slice(0, -1) : line;

/**
 * Gathers bytes into lines, for transports without a stream of their own. Gives the same lines as
 * guard and readline parser together, however the bytes are cut; empty lines are left out.
 */
export class LineSplitter {
  readonly guard: LengthGuard;
  private rest = "";
  private readonly line: (line: string) => void;

  constructor(line: (line: string) => void, bytes_max?: number) {
    this.line = line;
    this.guard = new LengthGuard(bytes_max);
  }

  feed(chunk: Uint8Array): void {
    const passed = this.guard.pass(chunk);
    const text = Buffer.from(passed.buffer, passed.byteOffset, passed.length).toString("latin1");
    let from = 0;
    for (let end = text.indexOf("\n"); end >= 0; end = text.indexOf("\n", from)) {
      const line = withoutReturn(this.rest + text.slice(from, end));
      this.rest = "";
      from = end + 1;
      if (line !== "") this.line(line);
    }
    this.rest += text.slice(from);
  }
}
