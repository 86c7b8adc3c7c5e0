import type { LevelOrder } from "../../model/stream.ts";

/** What a transport tells. Each is called on the judging thread, and none may throw. */
export interface TransportHandlers {
  /** The connection stands: lines can be written. Never called from within `open`. */
  opened(): void;
  /** One received line without its end; bytes are characters 0 … 255. Never empty. */
  line(line: string): void;
  /** The connection is gone or never came, and why, in words. Once; not after `close`. */
  closed(why: string): void;
}

/**
 * One connection to one board. It is used once: a new connection is a new object, so that nothing
 * written for an old one can ever be sent on it.
 */
export interface Transport {
  /** What it leads to, for people: `/dev/ttyACM0 at 115200 baud`. */
  readonly name: string;
  open(handlers: TransportHandlers): void;
  /** Hands one line (with its end) over for sending; false where it was dropped instead. */
  write(line: string): boolean;
  /** Whether everything written before has left this computer, as far as it can be known. */
  readonly drained: boolean;
  /** Puts a modem line at a level; only serial ports have such lines. */
  level?(order: LevelOrder): void;
  /** Ends the connection at once. Safe at any time, and more than once. */
  close(): void;
}

/** A simulated bench, as a transport sees it: bytes in, bytes out. */
export interface BuiltInBench {
  write(bytes: Uint8Array): void;
  /** Set by the transport: called with what the board sends. */
  onBytes: (bytes: Uint8Array) => void;
  start(): void;
  stop(): void;
}

/** Longest silence of an open connection before it is given up: boards send ten lines a second. */
export const SILENCE_ms = 4000;
/** How often silence is looked for. */
export const SILENCE_LOOK_ms = 250;
/** Bytes waiting to be sent beyond which a line is dropped: a stuck port must not collect orders. */
export const WAITING_BYTES_MAX = 4096;
