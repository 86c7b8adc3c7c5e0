/** The kinds of field that PROTOCOL.md names under "Numbers". Each reader gives null for bad text. */

const DECIMAL = /^(0|[1-9][0-9]{0,9})$/;
const SIGNED = /^(0|-?[1-9][0-9]{0,9})$/;
const SCALE = /^(0|[1-9][0-9]{0,4})e(-?[0-9]{1,2})$/;

/** Largest value of each unsigned kind. */
export const U8_MAX = 255;
export const U16_MAX = 65_535;
export const U32_MAX = 4_294_967_295;

/** Unsigned decimal without sign or leading zero, 0 … `max`. */
export const readUnsigned = (text: string, max: number): number | null => {
  if (!DECIMAL.test(text)) return null;
  const n = Number(text);
  return n <= max ? n : null;
};

/** Signed decimal, −2147483648 … 2147483647; no leading zero, no "-0". */
export const readI32 = (text: string): number | null => {
  if (!SIGNED.test(text)) return null;
  const n = Number(text);
  return n >= -2_147_483_648 && n <= 2_147_483_647 ? n : null;
};

/** Exactly `digits` upper-case hexadecimal digits, given back as the text itself. */
export const readHexText = (text: string, digits: 4 | 8): string | null =>
  text.length === digits && /^[0-9A-F]+$/.test(text) ? text : null;

/** `a-z 0-9 . -`, starting with a letter, 1 … `letters_max` characters. */
export const readWord = (text: string, letters_max: number): string | null =>
  text.length <= letters_max && /^[a-z][a-z0-9.-]*$/.test(text) ? text : null;

/** `MANTISSAeEXPONENT`, mantissa u16, exponent −12 … 6 without leading zero; the nearest number. */
export const readScale = (text: string): number | null => {
  const match = SCALE.exec(text);
  if (match === null) return null;
  const mantissa = Number(match[1]);
  const exponent = readI32(match[2] ?? "");
  if (exponent === null || exponent < -12 || exponent > 6 || mantissa > U16_MAX) return null;
  return Number(text);
};
