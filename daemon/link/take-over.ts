import type { Sample } from "../model/sample.ts";

/**
 * Copies a sample that was found in order into the record that is judged. Channels it did not bring
 * keep the value they had, so that a late or doubled line changes nothing at all.
 */
export const takeOver = (from: Sample, to: Sample, channels: number): void => {
  to.seq = from.seq;
  to.tick = from.tick;
  to.status = from.status;
  to.cause = from.cause;
  to.ackSeq = from.ackSeq;
  to.ackAge_ticks = from.ackAge_ticks;
  to.conversions = from.conversions;
  to.group = from.group;
  for (let i = 0; i < channels; i += 1) {
    const fresh = from.fresh[i] ?? 0;
    to.fresh[i] = fresh;
    if (fresh === 1) to.values[i] = from.values[i] ?? 0;
  }
};
