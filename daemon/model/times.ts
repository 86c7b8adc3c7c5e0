/**
 * Three clocks that must never be mixed, so each is a type of its own.
 *
 * - `Mono_ms`: the host's monotonic clock, milliseconds, fractional. Judging uses only this one.
 * - `Wall_ms`: civil time, milliseconds since 1970-01-01 UTC. For people and for the record; it may
 *   be stepped at any moment, so nothing is ever judged by it.
 * - `Tick`: the controller's own counter, unsigned 32 bits, wraps. Its length is told in the
 *   introduction.
 */
export type Mono_ms = number & { readonly __clock: "mono" };
export type Wall_ms = number & { readonly __clock: "wall" };
export type Tick = number & { readonly __clock: "tick" };

/** Milliseconds of the monotonic clock, as a branded value. */
export const mono = (ms: number): Mono_ms => ms as Mono_ms;
/** Milliseconds of civil time, as a branded value. */
export const wall = (ms: number): Wall_ms => ms as Wall_ms;
/** A controller tick, reduced to 32 bits. */
export const tick = (n: number): Tick => (n >>> 0) as Tick;

/**
 * Signed distance from `earlier` to `later` of two wrapping 32-bit counters.
 * Right as long as the true distance is under 2^31; result in −2^31 … 2^31 − 1.
 */
export const counterDistance = (later: number, earlier: number): number => (later - earlier) | 0;

/** Where monotonic time, civil time and the port's deadline come from. The only clock port. */
export interface Clock {
  now(): Mono_ms;
  wall(): Wall_ms;
}
