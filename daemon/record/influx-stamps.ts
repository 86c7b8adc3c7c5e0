/** How finely a server keeps time: InfluxDB nanoseconds, VictoriaMetrics milliseconds. */
export type Precision = "n" | "ms";

/** Where the stamps of a run stand; plain data, kept with the place reached in the record. */
export interface StampState {
  readonly session: number;
  readonly wall_ms: number;
  /** Last stamp given: whole milliseconds, and nanoseconds beyond them. */
  readonly ms: number;
  readonly ns: number;
  readonly clock: number;
}

export const NO_STAMP: StampState = { session: -1, wall_ms: 0, ms: 0, ns: 0, clock: 0 };

const NANOS_A_MILLI = 1_000_000;

/**
 * Stamps that are unique within a session and follow from the record alone, so that a point written
 * twice is one point. Samples read in one go share their civil time: each gets the next free stamp
 * after it. Where civil time was put back, `clock` counts up and becomes a tag: nothing written
 * before is overwritten, and no stamp is moved away from its own time.
 */
export class Stamps {
  #state: StampState;
  readonly #precision: Precision;

  constructor(precision: Precision, state: StampState = NO_STAMP) {
    this.#precision = precision;
    this.#state = state;
  }

  get state(): StampState {
    return this.#state;
  }

  next(wall_ms: number, session: number): { readonly stamp: string; readonly clock: number } {
    const before = this.#state.session === session ? this.#state : NO_STAMP;
    const isBack = before !== NO_STAMP && wall_ms < before.wall_ms;
    const clock = isBack ? before.clock + 1 : before.clock;
    const at = this.#precision === "n" ? nanoseconds(wall_ms) : { ms: Math.round(wall_ms), ns: 0 };
    const isFree =
      before === NO_STAMP ||
      isBack ||
      at.ms > before.ms ||
      (at.ms === before.ms && at.ns > before.ns);
    const { ms, ns } = isFree ? at : this.#after(before);
    this.#state = { session, wall_ms, ms, ns, clock };
    return { stamp: this.#precision === "n" ? stampText(ms, ns) : String(ms), clock };
  }

  #after({ ms, ns }: StampState): { ms: number; ns: number } {
    if (this.#precision === "ms") return { ms: ms + 1, ns: 0 };
    return ns + 1 < NANOS_A_MILLI ? { ms, ns: ns + 1 } : { ms: ms + 1, ns: 0 };
  }
}

function nanoseconds(wall_ms: number): { ms: number; ns: number } {
  const ms = Math.floor(wall_ms);
  const ns = Math.round((wall_ms - ms) * NANOS_A_MILLI);
  return ns === NANOS_A_MILLI ? { ms: ms + 1, ns: 0 } : { ms, ns };
}

/** Nanoseconds since 1970 as digits: a number of JavaScript does not hold them. */
export const stampText = (ms: number, ns: number): string => `${ms}${String(ns).padStart(6, "0")}`;
