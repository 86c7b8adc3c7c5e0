import type { Input, View } from "../judge/records.ts";
import { type Ring, ROW } from "../model/ring.ts";
import { CHANNELS_MAX } from "../model/sample.ts";

/**
 * Writes one judged sample into the ring the recorder reads: the sample as it came, when it came,
 * and where the corridor stood. Allocates nothing.
 */
export function writeRow(ring: Ring, input: Input, view: View, wall_ms: number): void {
  const cells = ring.cells;
  const at = ring.offset(ring.written);
  const sample = input.sample;
  cells[at + ROW.input] = input.n;
  cells[at + ROW.mono_ms] = input.now_ms;
  cells[at + ROW.wall_ms] = wall_ms;
  cells[at + ROW.seq] = sample.seq;
  cells[at + ROW.tick] = sample.tick;
  cells[at + ROW.status] = sample.status;
  cells[at + ROW.cause] = sample.cause;
  cells[at + ROW.ackSeq] = sample.ackSeq;
  cells[at + ROW.ackAge_ticks] = sample.ackAge_ticks;
  cells[at + ROW.conversions] = sample.conversions;
  cells[at + ROW.group] = sample.group;
  cells[at + ROW.drift] = input.drift;
  cells[at + ROW.jump_ms] = input.jump_ms;
  cells[at + ROW.state] = view.state;
  cells[at + ROW.flags] = view.flags;
  cells[at + ROW.asked_mA] = view.asked_mA;
  cells[at + ROW.aim_mA] = view.aim_mA;
  cells[at + ROW.ceiling_mA] = view.ceiling_mA;
  cells[at + ROW.maker] = view.maker;
  cells[at + ROW.floor_mA] = view.floor_mA;
  cells[at + ROW.expected_mW] = view.expected_mW;
  cells[at + ROW.gate] = input.newest + 2 * input.portDrained;
  let low = 0;
  let high = 0;
  for (let i = 0; i < CHANNELS_MAX; i++) {
    cells[at + ROW.values + i] = sample.values[i] as number;
    const fresh = sample.fresh[i] as number;
    if (i < 32) low |= fresh << i;
    else high |= fresh << (i - 32);
  }
  cells[at + ROW.freshLow] = low >>> 0;
  cells[at + ROW.freshHigh] = high >>> 0;
  ring.publish();
}
