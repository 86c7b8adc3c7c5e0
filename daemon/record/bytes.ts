/**
 * Numbers as few bytes, for block codec 1 (BLOCKS.md). A varint has seven bits a byte, the lowest
 * first, the top bit set in all but the last; a signed one is 2x for x ≥ 0 and −2x − 1 below.
 */

/** A number beyond this cannot be doubled exactly, so it is no signed varint. */
export const SIGNED_MAX = 2 ** 51;

/** Bytes that grow as they are written. */
export class ByteWriter {
  #bytes = new Uint8Array(1024);
  #view = new DataView(this.#bytes.buffer);
  length = 0;

  u8(value: number): void {
    this.#room(1);
    this.#bytes[this.length++] = value;
  }

  u16(value: number): void {
    this.#room(2);
    this.#view.setUint16(this.length, value, true);
    this.length += 2;
  }

  u32(value: number): void {
    this.#room(4);
    this.#view.setUint32(this.length, value, true);
    this.length += 4;
  }

  f64(value: number): void {
    this.#room(8);
    this.#view.setFloat64(this.length, value, true);
    this.length += 8;
  }

  varint(value: number): void {
    this.#room(8);
    let rest = value;
    while (rest >= 128) {
      this.#bytes[this.length++] = 128 + (rest % 128);
      rest = Math.floor(rest / 128);
    }
    this.#bytes[this.length++] = rest;
  }

  signed(value: number): void {
    this.varint(value < 0 ? -2 * value - 1 : 2 * value);
  }

  bytes(from: Uint8Array): void {
    this.#room(from.length);
    this.#bytes.set(from, this.length);
    this.length += from.length;
  }

  /** What was written so far; valid until the next write. */
  get written(): Uint8Array {
    return this.#bytes.subarray(0, this.length);
  }

  #room(more: number): void {
    if (this.length + more <= this.#bytes.length) return;
    const grown = new Uint8Array(2 * (this.length + more));
    grown.set(this.#bytes);
    this.#bytes = grown;
    this.#view = new DataView(grown.buffer);
  }
}

/**
 * Reads what a ByteWriter wrote. Beyond the end everything is 0 and `overrun` is set, so that a
 * damaged block is found by one question at the end, not by an exception in the middle.
 */
export class ByteReader {
  readonly #bytes: Uint8Array;
  readonly #view: DataView;
  position: number;
  overrun = false;

  constructor(bytes: Uint8Array, position = 0) {
    this.#bytes = bytes;
    this.#view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
    this.position = position;
  }

  u8(): number {
    return this.#has(1) ? (this.#bytes[this.position++] as number) : 0;
  }

  u16(): number {
    if (!this.#has(2)) return 0;
    this.position += 2;
    return this.#view.getUint16(this.position - 2, true);
  }

  u32(): number {
    if (!this.#has(4)) return 0;
    this.position += 4;
    return this.#view.getUint32(this.position - 4, true);
  }

  f64(): number {
    if (!this.#has(8)) return 0;
    this.position += 8;
    return this.#view.getFloat64(this.position - 8, true);
  }

  varint(): number {
    let value = 0;
    for (let scale = 1; scale < 2 ** 56; scale *= 128) {
      const byte = this.u8();
      value += (byte & 127) * scale;
      if (byte < 128) return value;
    }
    this.overrun = true;
    return 0;
  }

  signed(): number {
    const value = this.varint();
    return value % 2 === 1 ? -(value + 1) / 2 : value / 2;
  }

  bytes(count: number): Uint8Array {
    if (!this.#has(count)) return new Uint8Array(0);
    this.position += count;
    return this.#bytes.subarray(this.position - count, this.position);
  }

  #has(count: number): boolean {
    if (this.position + count <= this.#bytes.length) return true;
    this.overrun = true;
    return false;
  }
}
