import { causeById } from "../model/cause.ts";
import type { BenchEvent } from "../model/event.ts";
import type { StoredLatch } from "../model/record-messages.ts";
import { wall } from "../model/times.ts";

/** Cause of a stored latch that holds none: the bench was armed or reset, and did not trip since. */
export const NOT_LATCHED = -1;
const UNKNOWN = 255;

/**
 * The latch after an event, or null where the event does not touch it. A trip keeps the first cause
 * until a reset; `lit` stands from arming to any end of light. The serial is the board's that was
 * armed or reset last, so that another board is noticed.
 */
export function latchAfter(
  before: StoredLatch | null,
  event: BenchEvent,
  serial: string,
): StoredLatch | null {
  const cause = before?.cause ?? NOT_LATCHED;
  const kept = before === null || before.serial === "" ? serial : before.serial;
  switch (event.kind) {
    case "armed":
      return { cause, wall: event.wall, serial, lit: true };
    case "dark":
      return before === null ? null : { ...before, lit: false };
    case "trip":
      if (cause !== NOT_LATCHED && before !== null) return { ...before, lit: false };
      return {
        cause: causeById(event.hazard)?.code ?? UNKNOWN,
        wall: event.wall,
        serial: kept,
        lit: false,
      };
    case "reset":
      return { cause: NOT_LATCHED, wall: event.wall, serial, lit: false };
    default:
      return null;
  }
}

/** A row of the table `latch`. */
export interface LatchRow {
  readonly cause: number;
  readonly wall_ms: number;
  readonly serial: string;
  readonly lit: number;
}

export const latchFrom = (row: LatchRow): StoredLatch => ({
  cause: row.cause,
  wall: wall(row.wall_ms),
  serial: row.serial,
  lit: row.lit === 1,
});
