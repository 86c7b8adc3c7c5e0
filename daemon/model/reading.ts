/** A second, independent reading. It is kept and compared, and never feeds a permit. */
export interface Reading {
  readonly id: number;
  readonly bench: string;
  /** Name of the witness; `typed` where a person typed it. */
  readonly name: string;
  /** Wall time, ms since 1970. */
  readonly at: number;
  readonly value: number;
  readonly unit: string;
  readonly typed: boolean;
  readonly who: string;
  readonly note: string;
}

/** Name under which typed readings are kept. */
export const TYPED = "typed";
/** Channels of witnesses are asked for as `witness.NAME`. */
const PREFIX = "witness.";

/** The witness behind a channel's name, or null where the channel is none. */
export const witnessOf = (channel: string): string | null =>
  channel.startsWith(PREFIX) ? channel.slice(PREFIX.length) : null;
