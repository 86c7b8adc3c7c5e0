import { BitReader, BitWriter } from "./bits.ts";
import type { ByteReader, ByteWriter } from "./bytes.ts";

/**
 * Entropy coding of what a predictor leaves (range asymmetric numeral systems, J. Duda, "Asymmetric
 * numeral systems: entropy coding combining speed of Huffman coding with compression rate of
 * arithmetic coding", arXiv:1311.2540, 2013). Four states take turns, value i with state i mod 4,
 * so that the processor works at four values at once. BLOCKS.md has the layout.
 */
const SCALE_BITS = 12;
const SCALE = 1 << SCALE_BITS;
/** States are at least this, and below 2^31, between two values. */
const STATE_MIN = 1 << 15;
const STATES = 4;
/** Symbols a column may have; rarer values escape. */
const SYMBOLS_MAX = 250;
/** Byte that stands for "all that is left" in a table of frequencies. */
const REST = 255;
/** Residuals are this wide, in mean absolute size, when their lower bits are kept as they are. */
const WIDE = 12;

/** Longest column that is packed at once. */
export const VALUES_MAX = 1 << 16;

const counts = new Uint32Array(SYMBOLS_MAX + 1);
const frequency = new Int32Array(SYMBOLS_MAX + 1);
const start = new Int32Array(SYMBOLS_MAX + 1);
const coded = new Uint8Array(SYMBOLS_MAX + 1);
const words = new Uint16Array(VALUES_MAX + 8);
const table = new Uint32Array(SCALE);

/** Frequency of a byte: 0 … 15 as they are, then a leading bit, four bits after it, and a shift. */
const fromByte = (byte: number): number =>
  byte < 16 ? byte : (16 + (byte & 15)) << ((byte >> 4) - 1);

/** The nearest frequency that a byte can say, at least 1. */
function toByte(value: number): number {
  if (value < 16) return Math.max(1, Math.round(value));
  const shift = 31 - Math.clz32(value) - 4;
  const rounded = Math.round(value / 2 ** shift);
  return rounded === 32 ? (shift + 2) << 4 : ((shift + 1) << 4) | (rounded & 15);
}

/** The stretch of symbols that a column uses: `low` … `low + m − 1`; everything else escapes. */
interface Alphabet {
  /** Lower bits that are kept as they are. */
  readonly raw: number;
  readonly low: number;
  readonly m: number;
}

/** Appends the first n values, 1 … VALUES_MAX of them. */
export function encodeRans(to: ByteWriter, values: Int32Array, n: number): void {
  const alphabet = alphabetOf(values, n);
  const { raw, low, m } = alphabet;
  setFrequencies(m, n);
  to.u8(raw);
  to.signed(low);
  to.varint(m);
  to.bytes(coded.subarray(0, m + 1));
  encodeSymbols(to, values, n, alphabet);
  if (raw > 0) writeRaw(to, values, n, raw);
  for (let i = 0; i < n; i++) {
    const symbol = ((values[i] as number) >> raw) - low;
    if (symbol < 0 || symbol >= m) to.signed(values[i] as number);
  }
}

/** Counts the symbols into `counts`, escapes last, and says which there are. */
function alphabetOf(values: Int32Array, n: number): Alphabet {
  let sum = 0;
  for (let i = 0; i < n; i++) sum += values[i] as number;
  const middle = Math.round(sum / n);
  let size = 0;
  for (let i = 0; i < n; i++) size += Math.abs((values[i] as number) - middle);
  const raw = Math.max(0, Math.ceil(Math.log2(size / n / WIDE)));
  let least = Number.POSITIVE_INFINITY;
  let most = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < n; i++) {
    const value = (values[i] as number) >> raw;
    if (value < least) least = value;
    if (value > most) most = value;
  }
  if (most - least >= SYMBOLS_MAX) {
    const from = (middle >> raw) - SYMBOLS_MAX / 2;
    least = Math.max(least, Math.min(from, most - SYMBOLS_MAX + 1));
    most = Math.min(most, least + SYMBOLS_MAX - 1);
  }
  counts.fill(0);
  const span = most - least + 1;
  for (let i = 0; i < n; i++) {
    const symbol = ((values[i] as number) >> raw) - least;
    const at = symbol >= 0 && symbol < span ? symbol : SYMBOLS_MAX;
    counts[at] = (counts[at] as number) + 1;
  }
  return trimmed(raw, least, span);
}

/** Symbols at the edges that come once at most escape: that is shorter than a longer table. */
function trimmed(raw: number, least: number, span: number): Alphabet {
  let from = 0;
  let to = span;
  let escapes = counts[SYMBOLS_MAX] as number;
  while (to - from > 1 && (counts[to - 1] as number) <= 1) escapes += counts[--to] as number;
  while (to - from > 1 && (counts[from] as number) <= 1) escapes += counts[from++] as number;
  counts.copyWithin(0, from, to);
  counts[to - from] = escapes;
  return { raw, low: least + from, m: to - from };
}

/** Frequencies that sum to SCALE, as the bytes of the table say them. */
function setFrequencies(m: number, n: number): void {
  let top = 0;
  for (let s = 1; s <= m; s++) if ((counts[s] as number) > (counts[top] as number)) top = s;
  for (let fit = 1; ; fit *= 0.98) {
    let rest = SCALE;
    for (let s = 0; s <= m; s++) {
      if (s === top) continue;
      const count = counts[s] as number;
      coded[s] = count === 0 ? 0 : toByte(((count * SCALE) / n) * fit);
      rest -= fromByte(coded[s] as number);
    }
    coded[top] = REST;
    // A table of one symbol only would need all of SCALE, which the decoder's cells cannot say.
    if (rest === SCALE) {
      const other = top === 0 ? 1 : 0;
      coded[other] = 1;
      rest--;
    }
    if (rest > 0) break;
  }
  expand(m);
}

/** Fills `frequency` and `start` from `coded`. False where the table makes no sense. */
function expand(m: number): boolean {
  let rest = SCALE;
  let top = -1;
  for (let s = 0; s <= m; s++) {
    if (coded[s] === REST) top = top < 0 ? s : m + 1;
    else rest -= fromByte(coded[s] as number);
  }
  if (top < 0 || top > m || rest <= 0 || rest >= SCALE) return false;
  let sum = 0;
  for (let s = 0; s <= m; s++) {
    frequency[s] = s === top ? rest : fromByte(coded[s] as number);
    start[s] = sum;
    sum += frequency[s] as number;
  }
  return true;
}

function encodeSymbols(to: ByteWriter, values: Int32Array, n: number, alphabet: Alphabet): void {
  const { raw, low, m } = alphabet;
  const state = [STATE_MIN, STATE_MIN, STATE_MIN, STATE_MIN];
  let at = words.length;
  for (let i = n - 1; i >= 0; i--) {
    let symbol = ((values[i] as number) >> raw) - low;
    if (symbol < 0 || symbol >= m) symbol = m;
    const f = frequency[symbol] as number;
    let x = state[i & 3] as number;
    if (x >= f << 19) {
      words[--at] = x & 0xffff;
      x >>>= 16;
    }
    const whole = (x / f) | 0;
    state[i & 3] = (whole << SCALE_BITS) + (x - whole * f) + (start[symbol] as number);
  }
  for (const x of state) to.u32(x);
  to.varint(words.length - at);
  for (; at < words.length; at++) to.u16(words[at] as number);
}

function writeRaw(to: ByteWriter, values: Int32Array, n: number, raw: number): void {
  const bits = new BitWriter(to);
  const mask = raw === 31 ? 0x7fffffff : (1 << raw) - 1;
  for (let i = 0; i < n; i++) bits.put((values[i] as number) & mask, raw);
  bits.end();
}

/** Reads n values into `values`. False where the bytes make no sense. */
export function decodeRans(from: ByteReader, values: Int32Array, n: number): boolean {
  const raw = from.u8();
  const low = from.signed();
  const m = from.varint();
  if (raw > 31 || m < 1 || m > SYMBOLS_MAX) return false;
  coded.set(from.bytes(m + 1));
  if (from.overrun || !expand(m)) return false;
  for (let s = 0; s <= m; s++) {
    const f = frequency[s] as number;
    const first = start[s] as number;
    for (let k = 0; k < f; k++) table[first + k] = (f << 20) | (k << 8) | s;
  }
  if (!decodeSymbols(from, values, n, low)) return false;
  const escaped = (coded[m] as number) === 0 ? [] : placesOf(values, n, (low + m) | 0);
  if (raw > 0) readRaw(from, values, n, raw);
  for (const i of escaped) values[i] = from.signed();
  return !from.overrun;
}

function decodeSymbols(from: ByteReader, values: Int32Array, n: number, low: number): boolean {
  let a = from.u32();
  let b = from.u32();
  let c = from.u32();
  let d = from.u32();
  const count = from.varint();
  if (count > n) return false;
  const bytes = from.bytes(2 * count);
  if (from.overrun || Math.max(a, b, c, d) >= 2 ** 31) return false;
  words.set(alignedWords(bytes));
  words.fill(0, count, count + STATES);
  let at = 0;
  const whole = n - (n % STATES);
  for (let i = 0; i < whole; i += STATES) {
    const p = table[a & (SCALE - 1)] as number;
    const q = table[b & (SCALE - 1)] as number;
    const r = table[c & (SCALE - 1)] as number;
    const s = table[d & (SCALE - 1)] as number;
    a = (Math.imul(p >>> 20, a >>> SCALE_BITS) + ((p >>> 8) & 0xfff)) | 0;
    b = (Math.imul(q >>> 20, b >>> SCALE_BITS) + ((q >>> 8) & 0xfff)) | 0;
    c = (Math.imul(r >>> 20, c >>> SCALE_BITS) + ((r >>> 8) & 0xfff)) | 0;
    d = (Math.imul(s >>> 20, d >>> SCALE_BITS) + ((s >>> 8) & 0xfff)) | 0;
    values[i] = (p & 255) + low;
    values[i + 1] = (q & 255) + low;
    values[i + 2] = (r & 255) + low;
    values[i + 3] = (s & 255) + low;
    if (a < STATE_MIN) a = (a << 16) | (words[at++] as number);
    if (b < STATE_MIN) b = (b << 16) | (words[at++] as number);
    if (c < STATE_MIN) c = (c << 16) | (words[at++] as number);
    if (d < STATE_MIN) d = (d << 16) | (words[at++] as number);
  }
  const state = [a, b, c, d];
  for (let i = whole; i < n; i++) {
    let x = state[i & 3] as number;
    const p = table[x & (SCALE - 1)] as number;
    x = (Math.imul(p >>> 20, x >>> SCALE_BITS) + ((p >>> 8) & 0xfff)) | 0;
    values[i] = (p & 255) + low;
    if (x < STATE_MIN) x = (x << 16) | (words[at++] as number);
    state[i & 3] = x;
  }
  // A stream that was written ends where it began.
  return at === count && state.every((x) => x === STATE_MIN);
}

/** The words of a piece of a blob, which may begin at an odd byte (this machine is little-endian). */
function alignedWords(bytes: Uint8Array): Uint16Array {
  if (bytes.byteOffset % 2 === 0) {
    return new Uint16Array(bytes.buffer, bytes.byteOffset, bytes.length / 2);
  }
  // Not slice(), which a Buffer answers with a view of itself.
  return new Uint16Array(new Uint8Array(bytes).buffer);
}

function readRaw(from: ByteReader, values: Int32Array, n: number, raw: number): void {
  const bits = new BitReader(from);
  for (let i = 0; i < n; i++) values[i] = ((values[i] as number) << raw) | bits.take(raw);
  bits.end();
}

function placesOf(values: Int32Array, n: number, wanted: number): number[] {
  const places: number[] = [];
  for (let i = 0; i < n; i++) if (values[i] === wanted) places.push(i);
  return places;
}
