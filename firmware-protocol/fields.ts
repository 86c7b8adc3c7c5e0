import { z } from "zod";
import {
  readHexText,
  readI32,
  readScale,
  readUnsigned,
  readWord,
  U8_MAX,
  U16_MAX,
  U32_MAX,
} from "./numbers.ts";

/** Field kinds as zod schemas: text in, value out. */

const kind = <T extends string | number>(read: (text: string) => T | null, wanted: string) =>
  z.string().transform((text, context): T => {
    const value = read(text);
    if (value !== null) return value;
    context.addIssue({ code: "custom", message: `found "${text}", wanted ${wanted}` });
    return z.NEVER;
  });

/** A decimal without sign, `min` … `max`, both included. */
export const between = (min: number, max: number) =>
  kind((text) => {
    const n = readUnsigned(text, max);
    return n !== null && n >= min ? n : null;
  }, `a whole number ${min} to ${max}`);

export const u8 = between(0, U8_MAX);
export const u16 = between(0, U16_MAX);
export const u32 = between(0, U32_MAX);
export const i32 = kind(readI32, "a whole number of 32 bits with sign");
export const h32 = kind((text) => readHexText(text, 8), "8 upper-case hexadecimal digits");
export const scale = kind(readScale, "a scale such as 16e-2");
export const word = (letters_max: number) =>
  kind((text) => readWord(text, letters_max), `a word of at most ${letters_max} characters`);

/** One of a closed list. */
export const oneOf = <const W extends string>(words: readonly W[]) =>
  kind((text) => words.find((w) => w === text) ?? null, `one of ${words.join(", ")}`);

/** Text that matches a pattern. */
export const matching = (pattern: RegExp, wanted: string) =>
  kind((text) => (pattern.test(text) ? text : null), wanted);

/** Any field that is not empty. */
export const anything = matching(/^[!-~]+$/, "printable characters");
