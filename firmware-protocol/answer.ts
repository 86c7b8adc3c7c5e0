import { crc32Text, hex32 } from "./crc.ts";

/** What the controller offered, and what the host knows of it. All of it goes into the answer. */
export interface ArmTerms {
  /** One-time number, 8 hex digits, and the boot and arm counters of the offer. */
  readonly number: string;
  readonly boot: number;
  readonly arms: number;
  /** Checksum of the curve that the host loaded, 8 hex digits. */
  readonly curveCrc: string;
  readonly absolute_counts: number;
  readonly term_ticks_min: number;
  readonly term_ticks_max: number;
  readonly protocol: number;
  readonly firmware: string;
}

/** The text that the answer sums: single spaces, numbers as in the introduction. */
export const armAnswerText = (terms: ArmTerms): string =>
  [
    terms.number,
    terms.boot,
    terms.arms,
    terms.curveCrc,
    terms.absolute_counts,
    terms.term_ticks_min,
    terms.term_ticks_max,
    terms.protocol,
    terms.firmware,
  ].join(" ");

/** CRC-32 of `armAnswerText`: right only for this offer and this configuration. */
export const armAnswer = (terms: ArmTerms): number => crc32Text(armAnswerText(terms));

/** A curve as it travels: counts of `case`, strictly ascending, and counts of `set`. */
export interface CurvePoints {
  readonly x: readonly number[];
  readonly y: readonly number[];
}

/** Fewest and most points of a curve. */
export const CURVE_POINTS_MIN = 2;
export const CURVE_POINTS_MAX = 32;

/** CRC-32 over all points, X then Y, little-endian 16 bits each, as 8 hex digits. */
export const curveCrc = (points: CurvePoints): string => {
  let bytes = "";
  points.x.forEach((x, i) => {
    const y = points.y[i] ?? 0;
    bytes += String.fromCharCode(x & 0xff, (x >> 8) & 0xff, y & 0xff, (y >> 8) & 0xff);
  });
  return hex32(crc32Text(bytes));
};
