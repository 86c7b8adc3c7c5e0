import type { ByteReader, ByteWriter } from "./bytes.ts";

/** Bits into bytes, the lowest first. */
export class BitWriter {
  readonly #to: ByteWriter;
  #held = 0;
  #count = 0;

  constructor(to: ByteWriter) {
    this.#to = to;
  }

  /** @param count 0 … 31 */
  put(value: number, count: number): void {
    for (let rest = value, left = count; left > 0; ) {
      const room = Math.min(8 - this.#count, left);
      this.#held |= (rest & ((1 << room) - 1)) << this.#count;
      this.#count += room;
      rest >>>= room;
      left -= room;
      if (this.#count === 8) this.end();
    }
  }

  /** Completes the byte that was begun. */
  end(): void {
    if (this.#count > 0) this.#to.u8(this.#held);
    this.#held = 0;
    this.#count = 0;
  }
}

/** Reads what a BitWriter wrote. */
export class BitReader {
  readonly #from: ByteReader;
  #held = 0;
  #count = 0;

  constructor(from: ByteReader) {
    this.#from = from;
  }

  /** @param count 0 … 31 */
  take(count: number): number {
    let value = 0;
    for (let got = 0; got < count; ) {
      if (this.#count === 0) {
        this.#held = this.#from.u8();
        this.#count = 8;
      }
      const taken = Math.min(this.#count, count - got);
      value |= (this.#held & ((1 << taken) - 1)) << got;
      this.#held >>>= taken;
      this.#count -= taken;
      got += taken;
    }
    return value;
  }

  /** Leaves what is left of the byte that was begun. */
  end(): void {
    this.#held = 0;
    this.#count = 0;
  }
}
