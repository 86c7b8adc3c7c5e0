/** Status bits of a sample line. PROTOCOL.md and core.h have the same table; a test compares. */
export const STATUS = {
  emitting: 1 << 0,
  armed: 1 << 1,
  tripped: 1 << 2,
  key: 1 << 3,
  loop: 1 << 4,
  fan: 1 << 5,
  limited: 1 << 6,
  injected: 1 << 7,
  hand: 1 << 8,
  lockout: 1 << 9,
  delay: 1 << 10,
  anchor: 1 << 11,
  indicator: 1 << 12,
  shutter: 1 << 13,
  curve: 1 << 14,
} as const;

/** Most channels a manifest may have; the length of a sample's value array. */
export const CHANNELS_MAX = 64;

/**
 * All channels at one instant, as raw counts, exactly as the controller sent them.
 * Mutable and reused: the link decodes into one record, nobody keeps a reference to it.
 */
export interface Sample {
  seq: number;
  tick: number;
  status: number;
  /** Cause code of the latch while tripped, else of the last dark. */
  cause: number;
  /** Sample number the last accepted permit named; −1 while there is none in this session. */
  ackSeq: number;
  /** That permit's age on arrival, ticks; −1 while there is none. The true loop delay. */
  ackAge_ticks: number;
  /** Conversions since boot, 16 bits, wraps: a stopped converter stands still. */
  conversions: number;
  group: number;
  /** Counts by channel index; channels of other groups keep their last value. */
  values: Int32Array;
  /** 1 where `values` was refreshed by this sample. */
  fresh: Uint8Array;
}

/** A blank sample. */
export const newSample = (): Sample => ({
  seq: 0,
  tick: 0,
  status: 0,
  cause: 0,
  ackSeq: -1,
  ackAge_ticks: -1,
  conversions: 0,
  group: 0,
  values: new Int32Array(CHANNELS_MAX),
  fresh: new Uint8Array(CHANNELS_MAX),
});
