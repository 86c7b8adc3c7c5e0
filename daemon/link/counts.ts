import type { BrokenKind } from "../../firmware-protocol/line.ts";

/** What came over the link since the daemon started, by kind. Plain numbers, counted up in place. */
export interface LinkCounts extends Record<BrokenKind, number> {
  /** Lines received, good and bad, and lines sent. */
  received: number;
  sent: number;
  /** Samples handed over. */
  samples: number;
  /** Good samples that came before the introduction told how to read them. */
  early: number;
  /** Sample numbers that never came. */
  lost: number;
  /** Samples dropped because they came again, or after a newer one. */
  duplicate: number;
  reordered: number;
  /** Answers that nobody waited for. */
  unexpected: number;
  permits: number;
  permitsRefused: number;
  /** Boards that started anew under our eyes, and connections made. */
  resets: number;
  connections: number;
}

export const newCounts = (): LinkCounts => ({
  received: 0,
  sent: 0,
  samples: 0,
  early: 0,
  lost: 0,
  duplicate: 0,
  reordered: 0,
  unexpected: 0,
  permits: 0,
  permitsRefused: 0,
  resets: 0,
  connections: 0,
  empty: 0,
  long: 0,
  char: 0,
  direction: 0,
  crc: 0,
  verb: 0,
  form: 0,
});

/** Lines that came and could not be used, of every kind. */
export const brokenLines = (counts: LinkCounts): number =>
  counts.crc + counts.char + counts.long + counts.verb + counts.form + counts.direction;
