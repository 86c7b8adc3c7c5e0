import type { Manifest } from "../daemon/model/manifest.ts";
import { CHANNELS_MAX, type Sample } from "../daemon/model/sample.ts";
import { type BrokenKind, checkLine } from "./line.ts";
import { readHexText, readI32, readUnsigned, U8_MAX, U16_MAX, U32_MAX } from "./numbers.ts";

/** Highest group number; group 0 is in every sample. */
export const GROUP_MAX = 15;
const VERB = "<sample ";
const HEADER_FIELDS = 8;

/** Fields of a sample, read without a manifest. −1 stands for "none" in ack and age. */
export interface SampleFields {
  readonly seq: number;
  readonly tick: number;
  readonly status: number;
  readonly cause: number;
  readonly ack: number;
  readonly age: number;
  readonly conv: number;
  readonly group: number;
  readonly values: readonly number[];
}

const orNone = (text: string, max: number): number | null =>
  text === "-" ? -1 : readUnsigned(text, max);

/** Reads a sample's fields as any other line's: for vectors and tools, not for the judging loop. */
export const readSample = (fields: readonly string[]): SampleFields | null => {
  if (fields.length < HEADER_FIELDS) return null;
  const seq = readUnsigned(fields[0] ?? "", U32_MAX);
  const tick = readUnsigned(fields[1] ?? "", U32_MAX);
  const status = readHexText(fields[2] ?? "", 4);
  const cause = readUnsigned(fields[3] ?? "", U8_MAX);
  const ack = orNone(fields[4] ?? "", U32_MAX);
  const age = orNone(fields[5] ?? "", U16_MAX);
  const conv = readUnsigned(fields[6] ?? "", U16_MAX);
  const group = readUnsigned(fields[7] ?? "", GROUP_MAX);
  if (seq === null || tick === null || status === null || cause === null) return null;
  if (ack === null || age === null || conv === null || group === null) return null;
  const values: number[] = [];
  for (const text of fields.slice(HEADER_FIELDS)) {
    const value = readI32(text);
    if (value === null || values.length === CHANNELS_MAX) return null;
    values.push(value);
  }
  return { seq, tick, status: Number.parseInt(status, 16), cause, ack, age, conv, group, values };
};

/** Which channels stand in a sample of each group, in their order, and room for decoding one. */
export interface SampleGroups {
  /** By group number; null where the manifest has no channel in that group. */
  readonly channels: readonly (Uint8Array | null)[];
  readonly scratch: Int32Array;
}

/** The order of values in samples of each group, as the manifest fixes it. */
export const sampleGroups = (manifest: Manifest): SampleGroups => {
  const zero = manifest.channels.filter((c) => c.group === 0).map((c) => c.index);
  const channels: (Uint8Array | null)[] = [];
  for (let group = 0; group <= GROUP_MAX; group += 1) {
    const own = manifest.channels.filter((c) => c.group === group).map((c) => c.index);
    if (own.length === 0) channels.push(null);
    else channels.push(Uint8Array.from(group === 0 ? zero : [...zero, ...own]));
  }
  return { channels, scratch: new Int32Array(CHANNELS_MAX) };
};

/** Walks the characters of one line. Reused, so that a sample costs no allocation. */
class Cursor {
  private text = "";
  private at = 0;
  private end = 0;
  /** Set once a field was not of its kind; everything read after it is worthless. */
  failed = false;

  start(text: string, at: number, end: number): void {
    this.text = text;
    this.at = at;
    this.end = end;
    this.failed = false;
  }

  /** Whether every character before the checksum was read. */
  atEnd(): boolean {
    return this.at === this.end + 1;
  }

  /** Steps over the space after a field, or one past the end. */
  private close(): void {
    if (this.at !== this.end && this.text.charCodeAt(this.at) !== 0x20) this.failed = true;
    this.at += 1;
  }

  /** A run of digits without leading zero, at most `max`. */
  private digits(max: number): number {
    const first = this.at;
    let n = 0;
    while (this.at < this.end) {
      const digit = this.text.charCodeAt(this.at) - 0x30;
      if (digit < 0 || digit > 9) break;
      n = n * 10 + digit;
      this.at += 1;
      if (n > max) break;
    }
    const length = this.at - first;
    if (length === 0 || n > max) this.failed = true;
    else if (length > 1 && this.text.charCodeAt(first) === 0x30) this.failed = true;
    return n;
  }

  unsigned(max: number): number {
    const n = this.digits(max);
    this.close();
    return n;
  }

  /** An unsigned number, or −1 for "-". */
  unsignedOrNone(max: number): number {
    if (this.at < this.end && this.text.charCodeAt(this.at) === 0x2d) {
      this.at += 1;
      this.close();
      return -1;
    }
    return this.unsigned(max);
  }

  signed(): number {
    const negative = this.at < this.end && this.text.charCodeAt(this.at) === 0x2d;
    if (negative) this.at += 1;
    const n = this.digits(negative ? 2_147_483_648 : 2_147_483_647);
    if (negative && n === 0) this.failed = true;
    this.close();
    return negative ? -n : n;
  }

  /** Exactly four upper-case hexadecimal digits. */
  hex16(): number {
    let n = 0;
    for (let i = 0; i < 4; i += 1) {
      const code = this.at < this.end ? this.text.charCodeAt(this.at) : 0;
      if (code >= 0x30 && code <= 0x39) n = (n << 4) | (code - 0x30);
      else if (code >= 0x41 && code <= 0x46) n = (n << 4) | (code - 0x37);
      else this.failed = true;
      this.at += 1;
    }
    this.close();
    return n;
  }
}

const cursor = new Cursor();

/**
 * Decodes one received line (without its end) into a reused record, by hand: it runs for every
 * sample and allocates nothing.
 *
 * @returns null where the record was filled; otherwise how the line is broken, and the record is
 *   as it was. A whole line that is no sample gives `verb`; a group or a number of values that the
 *   manifest does not have gives `form`.
 */
export const decodeSampleInto = (
  line: string,
  groups: SampleGroups,
  sample: Sample,
): BrokenKind | null => {
  const broken = checkLine(line, "host");
  if (broken !== null) return broken;
  if (!line.startsWith(VERB)) return "verb";
  cursor.start(line, VERB.length, line.length - 5);
  const seq = cursor.unsigned(U32_MAX);
  const tick = cursor.unsigned(U32_MAX);
  const status = cursor.hex16();
  const cause = cursor.unsigned(U8_MAX);
  const ack = cursor.unsignedOrNone(U32_MAX);
  const age = cursor.unsignedOrNone(U16_MAX);
  const conversions = cursor.unsigned(U16_MAX);
  const group = cursor.unsigned(GROUP_MAX);
  const channels = cursor.failed ? null : (groups.channels[group] ?? null);
  if (channels === null) return "form";
  const { scratch } = groups;
  for (let i = 0; i < channels.length; i += 1) scratch[i] = cursor.signed();
  if (cursor.failed || !cursor.atEnd()) return "form";
  sample.seq = seq;
  sample.tick = tick;
  sample.status = status;
  sample.cause = cause;
  sample.ackSeq = ack;
  sample.ackAge_ticks = age;
  sample.conversions = conversions;
  sample.group = group;
  sample.fresh.fill(0);
  for (let i = 0; i < channels.length; i += 1) {
    const index = channels[i] ?? 0;
    sample.values[index] = scratch[i] ?? 0;
    sample.fresh[index] = 1;
  }
  return null;
};
