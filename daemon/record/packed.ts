import type { ByteReader, ByteWriter } from "./bytes.ts";
import { SIGNED_MAX } from "./bytes.ts";
import {
  ANY_SIZE,
  choosePrediction,
  PREDICTOR,
  putBack,
  readPrediction,
  takeAway,
  writePrediction,
} from "./predict.ts";
import { decodeRans, encodeRans, VALUES_MAX } from "./rans.ts";
import { chooseRice, decodeRice, encodeRice } from "./rice.ts";

/**
 * One column of block codec 1. A column of numbers that are all whole, or whole after moving the
 * decimal point, becomes: offset + prediction + what is left, and what is left is coded. Any other
 * column is a table of its few different values, or its doubles as they are. BLOCKS.md has the
 * layout.
 */
const CODING = { equal: 0, rice: 1, rans: 2, doubles: 3, table: 4, double: 5 } as const;
const DIGITS_FOLLOW = 0x20;
const MODULO = 0x40;
const TWO_32 = 2 ** 32;
const TWO_31 = 2 ** 31;

/** Decimal places tried: the host's clocks count in millionths of a millisecond at most. */
const DIGITS_MAX = 6;
/** Different values that a column of doubles may have for a table to pay. */
const TABLE_MAX = 512;
/** Columns shorter than this never pay for a table of frequencies. */
const RANS_VALUES_MIN = 128;
/** What states and head of a column with a table cost, bits. */
const RANS_HEAD_bits = 8 * 24;

const whole = new Float64Array(VALUES_MAX);
const left = new Int32Array(VALUES_MAX);
const small = new Int32Array(VALUES_MAX);

/** Appends rows `from` … `to` (not included) of a column; VALUES_MAX at most. */
export function packColumn(out: ByteWriter, values: Float64Array, from: number, to: number): void {
  const n = to - from;
  const digits = wholeWith(values, from, to);
  if (digits >= 0 && packWhole(out, n, digits)) return;
  packDoubles(out, values, from, to);
}

/**
 * Fills `whole` with the values times 10^digits, all whole, with the fewest digits that make them
 * so; −1 where none do.
 */
function wholeWith(values: Float64Array, from: number, to: number): number {
  for (let digits = 0; digits <= DIGITS_MAX; digits++) {
    const power = 10 ** digits;
    let i = from;
    for (; i < to; i++) {
      const value = values[i] as number;
      const scaled = digits === 0 ? value : Math.round(value * power);
      if (scaled / power !== value || !(Math.abs(scaled) < SIGNED_MAX)) break;
      if (scaled !== Math.floor(scaled) || (scaled === 0 && Object.is(value, -0))) break;
      whole[i - from] = scaled;
    }
    if (i === to) return digits;
  }
  return -1;
}

/** Packs `whole`; false where its values lie too far apart. */
function packWhole(out: ByteWriter, n: number, digits: number): boolean {
  const offset = whole[0] as number;
  let least = offset;
  let most = offset;
  for (let i = 1; i < n; i++) {
    const value = whole[i] as number;
    if (value < least) least = value;
    if (value > most) most = value;
  }
  const kind = digits > 0 ? DIGITS_FOLLOW : 0;
  const head = (bits: number): void => {
    out.u8(kind | bits);
    if (digits > 0) out.u8(digits);
    out.signed(offset);
  };
  if (least === most) {
    head(CODING.equal);
    out.signed(0);
    return true;
  }
  const wraps = most - least >= TWO_31;
  if (wraps && !(least >= 0 && most < TWO_32)) return packAlongLine(out, n, head);
  for (let i = 0; i < n; i++) small[i] = (whole[i] as number) - offset;
  const size_max = wraps ? ANY_SIZE : Math.max(most - offset, offset - least);
  const how = choosePrediction(small, n, size_max);
  takeAway(small, n, how, left);
  const coding = chooseCoding(n);
  head((wraps ? MODULO : 0) | (how.by << 3) | coding.by);
  writePrediction(out, how);
  coding.write(out);
  return true;
}

/** Values that span more than 32 bits but keep near a line: a clock in fine units. */
function packAlongLine(out: ByteWriter, n: number, head: (bits: number) => void): boolean {
  const offset = whole[0] as number;
  const slope = ((whole[n - 1] as number) - offset) / (n - 1);
  for (let i = 0; i < n; i++) {
    const rest = (whole[i] as number) - offset - Math.floor(slope * i + 0.5);
    if (!(Math.abs(rest) < TWO_31)) return false;
    left[i] = rest;
  }
  const coding = chooseCoding(n);
  head((PREDICTOR.line << 3) | coding.by);
  writePrediction(out, { by: PREDICTOR.line, slope });
  coding.write(out);
  return true;
}

interface Coding {
  readonly by: number;
  write(out: ByteWriter): void;
}

function chooseCoding(n: number): Coding {
  const first = left[0] as number;
  let i = 1;
  while (i < n && left[i] === first) i++;
  if (i === n) return { by: CODING.equal, write: (out) => out.signed(first) };
  const byRans = { by: CODING.rans, write: (out: ByteWriter) => encodeRans(out, left, n) };
  if (n >= 2048) return byRans;
  const rice = chooseRice(left, n);
  if (n >= RANS_VALUES_MIN && ransBits(n) < rice.bits) return byRans;
  return { by: CODING.rice, write: (out) => encodeRice(out, left, n, rice.k) };
}

const tally = new Map<number, number>();

/** About what rANS would take for what is left, table included. */
function ransBits(n: number): number {
  tally.clear();
  for (let i = 0; i < n; i++) {
    const value = left[i] as number;
    tally.set(value, (tally.get(value) ?? 0) + 1);
  }
  let bits = RANS_HEAD_bits + 8 * tally.size;
  for (const count of tally.values()) bits -= count * Math.log2(count / n);
  return bits;
}

function packDoubles(out: ByteWriter, values: Float64Array, from: number, to: number): void {
  const n = to - from;
  const places = new Map<number, number>();
  const index = new Float64Array(n);
  let minusZero = false;
  for (let i = from; i < to && places.size <= TABLE_MAX; i++) {
    const value = values[i] as number;
    if (Object.is(value, -0)) minusZero = true;
    const place = places.get(value) ?? places.size;
    if (place === places.size) places.set(value, place);
    index[i - from] = place;
  }
  if (places.size === 1 && !minusZero) {
    out.u8(CODING.double);
    out.f64(values[from] as number);
    return;
  }
  if (minusZero || places.size > TABLE_MAX || 8 * places.size > 6 * n) {
    out.u8(CODING.doubles);
    for (let i = from; i < to; i++) out.f64(values[i] as number);
    return;
  }
  out.u8(CODING.table);
  out.varint(places.size);
  for (const value of places.keys()) out.f64(value);
  packColumn(out, index, 0, n);
}

/** The n values that `packColumn` wrote; null where the bytes make no sense. */
export function unpackColumn(from: ByteReader, n: number): Float64Array | null {
  const kind = from.u8();
  const coding = kind & 7;
  if (coding === CODING.double) return new Float64Array(n).fill(from.f64());
  if (coding === CODING.doubles) return readDoubles(from, n);
  if (coding === CODING.table) return readTable(from, n);
  const digits = (kind & DIGITS_FOLLOW) === 0 ? 0 : from.u8();
  if (digits > DIGITS_MAX) return null;
  const offset = from.signed();
  const how = readPrediction(from, (kind >> 3) & 3);
  if (!readLeft(from, coding, n) || from.overrun) return null;
  const values = new Float64Array(n);
  if (how.by === PREDICTOR.line && (kind & MODULO) === 0) {
    for (let i = 0; i < n; i++) {
      values[i] = offset + Math.floor(how.slope * i + 0.5) + (left[i] as number);
    }
  } else {
    putBack(left, n, how);
    if ((kind & MODULO) === 0) for (let i = 0; i < n; i++) values[i] = offset + (left[i] as number);
    else for (let i = 0; i < n; i++) values[i] = (offset + (left[i] as number)) >>> 0;
  }
  const power = 10 ** digits;
  if (digits > 0) for (let i = 0; i < n; i++) values[i] = (values[i] as number) / power;
  return values;
}

function readLeft(from: ByteReader, coding: number, n: number): boolean {
  if (coding === CODING.rans) return decodeRans(from, left, n);
  if (coding === CODING.rice) return decodeRice(from, left, n);
  if (coding !== CODING.equal) return false;
  left.fill(from.signed(), 0, n);
  return true;
}

function readDoubles(from: ByteReader, n: number): Float64Array | null {
  const values = new Float64Array(n);
  for (let i = 0; i < n; i++) values[i] = from.f64();
  return from.overrun ? null : values;
}

function readTable(from: ByteReader, n: number): Float64Array | null {
  const size = from.varint();
  if (size > TABLE_MAX + 1) return null;
  const table = readDoubles(from, size);
  const values = unpackColumn(from, n);
  if (table === null || values === null) return null;
  for (let i = 0; i < n; i++) values[i] = table[values[i] as number] ?? Number.NaN;
  return values;
}
