/**
 * Three clocks that must never be mixed; the two of this computer are types of their own.
 *
 * - `Mono_ms`: the host's monotonic clock, milliseconds, fractional. Judging uses only this one.
 * - `Wall_ms`: civil time, milliseconds since 1970-01-01 UTC. For people and for the record; it may
 *   be stepped at any moment, so nothing is ever judged by it.
 * - The controller's ticks: unsigned 32 bits, wrapping. A tick's length is told in the introduction.
 *   Names say `tick` or `ticks`, and ticks are compared by `counterDistance` alone.
 */
export type Mono_ms = number & { readonly __clock: "mono" };
export type Wall_ms = number & { readonly __clock: "wall" };

/** Milliseconds of the monotonic clock, as a branded value. */
export const mono = (ms: number): Mono_ms => ms as Mono_ms;
/** Milliseconds of civil time, as a branded value. */
export const wall = (ms: number): Wall_ms => ms as Wall_ms;

/**
 * Signed distance from `earlier` to `later` of two wrapping 32-bit counters.
 * Right as long as the true distance is under 2^31; result in −2^31 … 2^31 − 1.
 */
export const counterDistance = (later: number, earlier: number): number => (later - earlier) | 0;
