import { BitReader, BitWriter } from "./bits.ts";
import type { ByteReader, ByteWriter } from "./bytes.ts";

/**
 * Codes without a table, for short columns (R. F. Rice, "Some practical universal noiseless coding
 * techniques", JPL Publication 79-22, 1979): the value with its sign last, its upper part as so many
 * ones and a zero, its lower k bits as they are. An upper part of ESCAPE stands for a value that
 * follows behind the bits.
 */
const ESCAPE = 24;
const K_MAX = 30;

const folded = (value: number): number => ((value << 1) ^ (value >> 31)) >>> 0;

/** Bits that n values take with k lower ones. */
function bitsWith(values: Int32Array, n: number, k: number): number {
  let bits = n * (1 + k);
  for (let i = 0; i < n; i++) {
    const upper = folded(values[i] as number) >>> k;
    bits += upper < ESCAPE ? upper : ESCAPE + 40;
  }
  return bits;
}

/** The best k for the first n values, and the bits they then take. */
export function chooseRice(values: Int32Array, n: number): { k: number; bits: number } {
  let best = { k: 0, bits: bitsWith(values, n, 0) };
  for (let k = 1; k <= K_MAX; k++) {
    const bits = bitsWith(values, n, k);
    if (bits > best.bits) break;
    best = { k, bits };
  }
  return best;
}

export function encodeRice(to: ByteWriter, values: Int32Array, n: number, k: number): void {
  to.u8(k);
  const bits = new BitWriter(to);
  for (let i = 0; i < n; i++) {
    const value = folded(values[i] as number);
    const upper = value >>> k;
    if (upper >= ESCAPE) {
      bits.put(2 ** ESCAPE - 1, ESCAPE);
      continue;
    }
    bits.put(2 ** upper - 1, upper + 1);
    bits.put(value & (2 ** k - 1), k);
  }
  bits.end();
  for (let i = 0; i < n; i++) {
    if (folded(values[i] as number) >>> k >= ESCAPE) to.signed(values[i] as number);
  }
}

/** Reads n values into `values`. False where the bytes make no sense. */
export function decodeRice(from: ByteReader, values: Int32Array, n: number): boolean {
  const k = from.u8();
  if (k > K_MAX) return false;
  const escaped: number[] = [];
  const bits = new BitReader(from);
  for (let i = 0; i < n; i++) {
    let upper = 0;
    while (upper < ESCAPE && bits.take(1) === 1) upper++;
    if (upper === ESCAPE) {
      escaped.push(i);
      continue;
    }
    const value = ((upper << k) | bits.take(k)) >>> 0;
    values[i] = (value >>> 1) ^ -(value & 1);
  }
  bits.end();
  for (const i of escaped) values[i] = from.signed();
  return !from.overrun;
}
