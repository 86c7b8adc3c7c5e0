/**
 * The controller core as the built-in bench runs it: the same C as on a real board, in WebAssembly.
 * One instance is one board. The caller owns time (ticks of 1 ms) and everything measured.
 */

/** What the module exports; see north_board.c. */
interface Exports {
  readonly memory: WebAssembly.Memory;
  readonly configure: (rate_perS: number, seed: number) => void;
  readonly serial_at: () => number;
  readonly nv_at: () => number;
  readonly values_at: () => number;
  readonly sent_at: () => number;
  readonly boot: (resetKind: number) => void;
  readonly byte: (received: number) => number;
  readonly line_break: () => void;
  readonly inputs: (key: number, loop: number, fan: number, hand: number) => void;
  readonly conversion: (current_counts: number, tick: number) => void;
  readonly reading: (tick: number) => void;
  readonly pass: (tick: number) => void;
  readonly sent_take: () => number;
  readonly output: () => number;
}

/** In the order of enum core_reset in board.h. */
const RESET_KINDS = ["power", "brown-out", "watchdog", "external"] as const;
export type ResetKind = (typeof RESET_KINDS)[number];

/** Bytes of non-volatile memory, CORE_NV_BYTES in board.h. */
export const NV_BYTES = 128;
/** Channels of the built-in bench's manifest, in the order in which `reading` takes them. */
export const NORTH_CHANNELS = [
  "set",
  "current",
  "case",
  "photodiode",
  "forward",
  "sink",
  "ambient",
  "fan",
  "supply",
] as const;

const SERIAL_BYTES = 13;
const ERASED = 0xff;
const ENABLED_BIT = 1 << 16;
const INDICATOR_BIT = 1 << 17;
const NOTHING = new Uint8Array(0);

export interface ControllerOptions {
  /** Samples per second that `hello` states, 1 … 65535; the caller keeps to it in `reading`. */
  readonly rate_perS: number;
  /** Seed of the board's jitter, 32 bits, not 0. */
  readonly jitter: number;
  /** Non-volatile memory of before, NV_BYTES long; without it the memory is erased. */
  readonly nv?: Uint8Array;
  /** Serial number, 1–12 of `A-Z 0-9 -`; "NORTH-1" without. */
  readonly serial?: string;
}

/** One simulated board. Ticks are milliseconds, 32 bits, and wrap; they never step back. */
export interface SimController {
  /** A reset: everything but non-volatile memory starts anew, dark. Sends the boot line. */
  boot(kind: ResetKind, tick: number): void;
  /** Bytes from the host. What does not fit the receive ring waits for the next pass. */
  receive(bytes: Uint8Array): void;
  /** A serial break. */
  receiveBreak(): void;
  /** Inputs as they stand now; `hand` when a button was moved just now. */
  inputs(key: boolean, loop: boolean, fan: boolean, hand: boolean): void;
  /** One unaveraged conversion of current, counts 0 … 65535. */
  conversion(current_counts: number, tick: number): void;
  /** A complete averaged set, counts in the order of NORTH_CHANNELS; sends a sample. */
  reading(values: Int32Array, tick: number): void;
  /** The main loop at this tick; it reads every line that waits. */
  pass(tick: number): void;
  /** Bytes sent since the last call, a copy. */
  sent(): Uint8Array;
  /** Counts of set at the output stage; 0 as soon as anything cut it. */
  readonly drive_counts: number;
  /** Whether the last pass toggled the enable: light is allowed. */
  readonly enabled: boolean;
  /** The emission indicator. */
  readonly indicator: boolean;
  /** Non-volatile memory, a copy. */
  readonly nv: Uint8Array;
}

const SERIAL = /^[A-Z0-9-]{1,12}$/;

function writeSerial(to: Uint8Array, serial: string): void {
  if (!SERIAL.test(serial)) {
    throw new RangeError(`serial "${serial}" is not 1 to 12 of A-Z 0-9 -`);
  }
  to.fill(0);
  for (let i = 0; i < serial.length; i++) to[i] = serial.charCodeAt(i);
}

function startMemory(to: Uint8Array, from: Uint8Array | undefined): void {
  if (from === undefined) {
    to.fill(ERASED);
    return;
  }
  if (from.length !== NV_BYTES) {
    throw new RangeError(`non-volatile memory of ${from.length} bytes, wanted ${NV_BYTES}`);
  }
  to.set(from);
}

class WasmController implements SimController {
  readonly #wasm: Exports;
  readonly #nv: Uint8Array;
  readonly #values: Int32Array;
  readonly #sentBytes: Uint8Array;
  #waiting: Uint8Array[] = [];

  constructor(wasm: Exports, options: ControllerOptions) {
    const { buffer } = wasm.memory;
    this.#wasm = wasm;
    this.#nv = new Uint8Array(buffer, wasm.nv_at(), NV_BYTES);
    this.#values = new Int32Array(buffer, wasm.values_at(), NORTH_CHANNELS.length);
    this.#sentBytes = new Uint8Array(buffer, wasm.sent_at());
    startMemory(this.#nv, options.nv);
    if (options.serial !== undefined) {
      writeSerial(new Uint8Array(buffer, wasm.serial_at(), SERIAL_BYTES), options.serial);
    }
    wasm.configure(options.rate_perS, options.jitter);
  }

  boot(kind: ResetKind, tick: number): void {
    this.#waiting = [];
    this.#wasm.boot(RESET_KINDS.indexOf(kind));
    this.#wasm.pass(tick);
  }

  receive(bytes: Uint8Array): void {
    if (this.#waiting.length > 0) {
      this.#waiting.push(bytes.slice());
      return;
    }
    const taken = this.#take(bytes);
    if (taken < bytes.length) this.#waiting.push(bytes.slice(taken));
  }

  receiveBreak(): void {
    this.#wasm.line_break();
  }

  inputs(key: boolean, loop: boolean, fan: boolean, hand: boolean): void {
    this.#wasm.inputs(key ? 1 : 0, loop ? 1 : 0, fan ? 1 : 0, hand ? 1 : 0);
  }

  conversion(current_counts: number, tick: number): void {
    this.#wasm.conversion(current_counts, tick);
  }

  reading(values: Int32Array, tick: number): void {
    this.#values.set(values);
    this.#wasm.reading(tick);
  }

  pass(tick: number): void {
    this.#wasm.pass(tick);
    while (this.#feedOnce()) this.#wasm.pass(tick);
  }

  sent(): Uint8Array {
    const length = this.#wasm.sent_take();
    return length === 0 ? NOTHING : this.#sentBytes.slice(0, length);
  }

  get drive_counts(): number {
    return this.#wasm.output() & 0xffff;
  }

  get enabled(): boolean {
    return (this.#wasm.output() & ENABLED_BIT) !== 0;
  }

  get indicator(): boolean {
    return (this.#wasm.output() & INDICATOR_BIT) !== 0;
  }

  get nv(): Uint8Array {
    return this.#nv.slice();
  }

  /** Fills the ring from `bytes`; how many went in. */
  #take(bytes: Uint8Array): number {
    for (let i = 0; i < bytes.length; i++) {
      if (this.#wasm.byte(bytes[i] ?? 0) === 0) return i;
    }
    return bytes.length;
  }

  /** Moves waiting bytes into the ring; false when nothing moved. */
  #feedOnce(): boolean {
    const first = this.#waiting[0];
    if (first === undefined) return false;
    const taken = this.#take(first);
    if (taken === first.length) this.#waiting.shift();
    else this.#waiting[0] = first.subarray(taken);
    return taken > 0;
  }
}

/**
 * A board of the built-in bench, not yet booted: call `boot` first. Throws RangeError on a serial
 * number or a memory that is not one.
 */
export function newController(
  module: WebAssembly.Module,
  options: ControllerOptions,
): SimController {
  const instance = new WebAssembly.Instance(module, {});
  return new WasmController(instance.exports as unknown as Exports, options);
}
