import { hex32 } from "./crc.ts";
import { seal } from "./line.ts";
import { readHexText, readUnsigned, U16_MAX, U32_MAX } from "./numbers.ts";

/**
 * The two lines that can lead to light, written and read by hand. The link session is their only
 * caller: what makes them stands in one place each.
 */

/** Fields of a permit. Cap, aim and amplitude are counts of `set`; term and period are ticks. */
export interface PermitFields {
  readonly session: string;
  readonly n: number;
  readonly cap: number;
  readonly aim: number;
  readonly term: number;
  /** null where the permit asks for no dither. */
  readonly dither: { readonly amplitude: number; readonly period: number } | null;
}

const wanted = (fits: boolean, what: string, found: number | string): void => {
  if (!fits) throw new RangeError(`a permit was made with ${what} ${found}`);
};

const isCount = (n: number, max: number): boolean => Number.isInteger(n) && n >= 0 && n <= max;

/**
 * The permit line, without its end. Nothing else raises current.
 *
 * @param session token of this arming, as `yes arm` told it
 * @param n number of the judged sample
 * @param cap_counts roof, counts of `set`
 * @param aim_counts set-point, counts of `set`, at most the cap
 * @param term_ticks controller ticks after sample n
 * @throws RangeError where a number is not legal: the caller is wrong, and no line leaves
 */
export const encodePermit = (
  session: string,
  n: number,
  cap_counts: number,
  aim_counts: number,
  term_ticks: number,
): string => {
  wanted(readHexText(session, 8) !== null && session !== "00000000", "session", session);
  wanted(isCount(n, U32_MAX), "sample number", n);
  wanted(isCount(cap_counts, U16_MAX), "cap", cap_counts);
  wanted(isCount(aim_counts, cap_counts), "an aim above its cap, or no whole number:", aim_counts);
  wanted(isCount(term_ticks, U16_MAX), "term", term_ticks);
  return seal(`>permit ${session} ${n} ${cap_counts} ${aim_counts} ${term_ticks}`);
};

/** The arm line, without its end. `answer` is the 32-bit number of `answer.ts`. */
export const encodeArm = (answer: number): string => seal(`>arm ${hex32(answer)}`);

/** Reads a permit's fields, or null where their form is wrong. Legality is the controller's to judge. */
export const readPermit = (fields: readonly string[]): PermitFields | null => {
  if (fields.length < 5 || fields.length > 6) return null;
  const session = readHexText(fields[0] ?? "", 8);
  const n = readUnsigned(fields[1] ?? "", U32_MAX);
  const cap = readUnsigned(fields[2] ?? "", U16_MAX);
  const aim = readUnsigned(fields[3] ?? "", U16_MAX);
  const term = readUnsigned(fields[4] ?? "", U16_MAX);
  if (session === null || n === null || cap === null || aim === null || term === null) return null;
  if (fields.length === 5) return { session, n, cap, aim, term, dither: null };
  const parts = (fields[5] ?? "").split("/");
  const amplitude = readUnsigned(parts[0] ?? "", U16_MAX);
  const period = readUnsigned(parts[1] ?? "", U16_MAX);
  if (parts.length !== 2 || amplitude === null || period === null) return null;
  return { session, n, cap, aim, term, dither: { amplitude, period } };
};
