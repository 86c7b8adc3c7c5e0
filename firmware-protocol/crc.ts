/**
 * The two checksums of the protocol, by table.
 *
 * - CRC-16/IBM-3740: width 16, polynomial 0x1021, initial value 0xFFFF, not reflected, no final xor;
 *   "123456789" gives 29B1. Closes every line.
 * - CRC-32/ISO-HDLC: polynomial 0x04C11DB7 reflected, initial value and final xor all ones;
 *   "123456789" gives CBF43926. Closes a manifest, a curve and the arm answer.
 *
 * Parameters and check values: catalogue of parametrised CRC algorithms.
 */

/** Polynomial of CRC-16/IBM-3740, most significant bit first. */
const CRC16_POLY = 0x1021;
/** Polynomial of CRC-32/ISO-HDLC, least significant bit first. */
const CRC32_POLY = 0xedb88320;

const table16 = new Uint16Array(256);
const table32 = new Int32Array(256);
for (let byte = 0; byte < 256; byte += 1) {
  let high = byte << 8;
  let low = byte;
  for (let bit = 0; bit < 8; bit += 1) {
    high = (high & 0x8000) !== 0 ? (high << 1) ^ CRC16_POLY : high << 1;
    low = (low & 1) !== 0 ? (low >>> 1) ^ CRC32_POLY : low >>> 1;
  }
  table16[byte] = high;
  table32[byte] = low;
}

/** CRC-16 of `bytes`, 0 … 65535. */
export const crc16 = (bytes: Uint8Array): number => {
  let crc = 0xffff;
  for (const byte of bytes) crc = ((crc << 8) & 0xffff) ^ (table16[(crc >>> 8) ^ byte] ?? 0);
  return crc;
};

/**
 * CRC-16 of the characters `from` (included) to `to` (excluded), each taken as one byte.
 * Characters above 0xFF count by their low byte; a line is judged for those before its checksum is.
 */
export const crc16Text = (text: string, from = 0, to = text.length): number => {
  let crc = 0xffff;
  for (let i = from; i < to; i += 1) {
    crc = ((crc << 8) & 0xffff) ^ (table16[(crc >>> 8) ^ (text.charCodeAt(i) & 0xff)] ?? 0);
  }
  return crc;
};

/** CRC-32 of `bytes`, 0 … 4294967295. */
export const crc32 = (bytes: Uint8Array): number => {
  let crc = -1;
  for (const byte of bytes) crc = (crc >>> 8) ^ (table32[(crc ^ byte) & 0xff] ?? 0);
  return ~crc >>> 0;
};

/** CRC-32 of the characters of `text`, each taken as one byte (its low eight bits). */
export const crc32Text = (text: string): number => {
  let crc = -1;
  for (let i = 0; i < text.length; i += 1) {
    crc = (crc >>> 8) ^ (table32[(crc ^ text.charCodeAt(i)) & 0xff] ?? 0);
  }
  return ~crc >>> 0;
};

/** Four upper-case hexadecimal digits of the low 16 bits. */
export const hex16 = (n: number): string =>
  (n & 0xffff).toString(16).toUpperCase().padStart(4, "0");
/** Eight upper-case hexadecimal digits of the low 32 bits. */
export const hex32 = (n: number): string => (n >>> 0).toString(16).toUpperCase().padStart(8, "0");
