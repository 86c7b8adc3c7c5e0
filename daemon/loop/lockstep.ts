import { type Mono_ms, mono, type Wall_ms, wall } from "../model/times.ts";
import type { Loop, Received } from "./loop.ts";

/** A simulated board on a simulated clock: bytes in, bytes out, time by order. */
export interface SimulatedBoard {
  write(bytes: Uint8Array): void;
  onBytes: (bytes: Uint8Array) => void;
  advance(to_ms: number): void;
}

/** Longest stretch of bytes without a line end that is kept; a line has at most 160. */
const REST_BYTES_MAX = 4096;

/**
 * Board and loop on one simulated clock, step by step: the night of a demo passes as fast as the
 * computer can, and the same seed gives the same night.
 */
export class Lockstep {
  readonly #board: SimulatedBoard;
  readonly #begin_ms: Wall_ms;
  #loop: Loop | null = null;
  #elapsed_ms = 0;
  #rest = "";
  #lines: Received[] = [];

  constructor(board: SimulatedBoard, begin_ms: Wall_ms) {
    this.#board = board;
    this.#begin_ms = begin_ms;
    board.onBytes = (bytes) => this.#bytes(bytes);
  }

  /** Simulated time since the start, ms. */
  get elapsed_ms(): number {
    return this.#elapsed_ms;
  }

  now(): Mono_ms {
    return mono(this.#elapsed_ms);
  }

  wall(): Wall_ms {
    return wall(this.#begin_ms + this.#elapsed_ms);
  }

  /** A line of the loop, put on the wire at once. */
  write(line: string): boolean {
    this.#board.write(asciiBytes(line));
    return true;
  }

  /** Plugs the cable in. */
  connect(loop: Loop): void {
    this.#loop = loop;
    loop.opened(this.now());
  }

  /** Pulls the cable: nothing passes any more, in either direction, until `connect`. */
  disconnect(why: string): void {
    const loop = this.#loop;
    this.#loop = null;
    this.#rest = "";
    loop?.closed(this.now(), why);
  }

  /** Moves both by `by_ms`. */
  step(by_ms: number): void {
    this.#elapsed_ms += by_ms;
    this.#board.advance(this.#elapsed_ms);
    const loop = this.#loop;
    if (loop === null) return;
    if (this.#lines.length > 0) {
      loop.receive(this.#lines);
      this.#lines = [];
    }
    if (this.#elapsed_ms >= loop.nextDeadline()) loop.elapse(this.now());
  }

  #bytes(bytes: Uint8Array): void {
    if (this.#loop === null) return;
    this.#rest += String.fromCharCode(...bytes);
    let end = this.#rest.indexOf("\n");
    while (end >= 0) {
      const stop = this.#rest.charCodeAt(end - 1) === 13 ? end - 1 : end;
      this.#lines.push({ line: this.#rest.slice(0, stop), at: this.now() });
      this.#rest = this.#rest.slice(end + 1);
      end = this.#rest.indexOf("\n");
    }
    if (this.#rest.length > REST_BYTES_MAX) this.#rest = "";
  }
}

function asciiBytes(text: string): Uint8Array {
  const bytes = new Uint8Array(text.length);
  for (let i = 0; i < text.length; i++) bytes[i] = text.charCodeAt(i);
  return bytes;
}
