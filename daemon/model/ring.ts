import { CHANNELS_MAX } from "./sample.ts";

/**
 * The last minute of samples in memory shared by the judging thread (the only writer) and the
 * recorder (the only reader): "recorder behind" is a subtraction, and a full or slow disk can never
 * hold the judge up. A row that is overwritten before it was read is lost and counted, by number.
 */
export const ROW = {
  /** Ordinal of the judge's input. */
  input: 0,
  mono_ms: 1,
  wall_ms: 2,
  seq: 3,
  tick: 4,
  status: 5,
  cause: 6,
  ackSeq: 7,
  ackAge_ticks: 8,
  conversions: 9,
  group: 10,
  drift: 11,
  jump_ms: 12,
  state: 13,
  flags: 14,
  asked_mA: 15,
  aim_mA: 16,
  ceiling_mA: 17,
  maker: 18,
  floor_mA: 19,
  expected_mW: 20,
  /** Bit sets of channels refreshed by this sample, 32 channels each. */
  freshLow: 21,
  freshHigh: 22,
  /** 1 where the sample was the newest read, plus 2 where the port had drained: inputs of the judge. */
  gate: 23,
  values: 24,
} as const;
export const ROW_LENGTH = ROW.values + CHANNELS_MAX;

const HEADER_BYTES = 16;

/** Bytes of shared memory for `rows` rows. */
export const ringBytes = (rows: number): number => HEADER_BYTES + rows * ROW_LENGTH * 8;

/** A view of the ring; writer and reader each make their own over the same memory. */
export class Ring {
  readonly rows: number;
  readonly memory: SharedArrayBuffer;
  readonly #head: BigUint64Array;
  readonly #cells: Float64Array;

  constructor(memory: SharedArrayBuffer) {
    this.memory = memory;
    this.#head = new BigUint64Array(memory, 0, 1);
    this.#cells = new Float64Array(memory, HEADER_BYTES);
    this.rows = Math.floor(this.#cells.length / ROW_LENGTH);
  }

  /** Rows written since the ring was made. */
  get written(): number {
    return Number(Atomics.load(this.#head, 0));
  }

  /** The cells of row `index` (counted from 0 since the ring was made), offset into `cells`. */
  offset(index: number): number {
    return (index % this.rows) * ROW_LENGTH;
  }

  get cells(): Float64Array {
    return this.#cells;
  }

  /** Publishes the row that was filled at `offset(written)`. Called by the writer alone. */
  publish(): void {
    Atomics.add(this.#head, 0, 1n);
  }
}
