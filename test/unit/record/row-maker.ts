import type { Channel, Manifest } from "../../../daemon/model/manifest.ts";
import { type Ring, ROW, ROW_LENGTH } from "../../../daemon/model/ring.ts";

const channel = (
  index: number,
  name: string,
  unit: string,
  perCount: number,
  group = 0,
): Channel => ({
  index,
  name,
  unit,
  perCount,
  count_min: 0,
  count_max: 4095,
  group,
});

/** Four judged channels and two slow ones that come every other sample. */
export const MANIFEST: Manifest = {
  id: "0badcafe",
  protocol: 1,
  firmware: "synthetic",
  serial: "S-1",
  boot: 1,
  tick_us: 1000,
  absolute_counts: 4000,
  curveCrc: "00000000",
  term_ticks_min: 150,
  term_ticks_max: 10_000,
  fall_ms: 10,
  rate_perS: 20,
  capabilities: [],
  channels: [
    channel(0, "set", "mA", 0.5),
    channel(1, "current", "mA", 0.5),
    channel(2, "case", "degC", 0.01),
    channel(3, "photodiode", "mW", 0.25),
    channel(4, "sink", "degC", 0.02, 1),
    channel(40, "humidity", "ratio", 0.001, 2),
  ],
};

/** A small generator of its own seed (mulberry32), 0 … 1. */
export function seeded(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = Math.imul(state ^ (state >>> 15), 1 | state);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
}

export const START_ms = 1_780_000_000_000;

/** One row as the loop would have written it; `at_ms` is both clocks' time since the start. */
export type RowMaker = (i: number) => Float64Array;

/** Rows of a plausible bench: noisy counts, slow channels every other sample, unknown at first. */
export function rowMaker(
  seed: number,
  at_ms: (i: number) => number,
  start_ms = START_ms,
): RowMaker {
  const random = seeded(seed);
  const values = new Float64Array(64);
  return (i) => {
    const row = new Float64Array(ROW_LENGTH);
    const at = at_ms(i);
    const slow = i % 2 === 0 ? 4 : 40;
    for (const index of [0, 1, 2, 3, slow]) values[index] = Math.floor(random() * 4096);
    const low = 0b1111 | (slow === 4 ? 1 << 4 : 0);
    row[ROW.input] = i + 1;
    row[ROW.mono_ms] = 1000.125 + at;
    row[ROW.wall_ms] = start_ms + at;
    row[ROW.seq] = (4_294_967_000 + i) % 4_294_967_296;
    row[ROW.tick] = (4_294_900_000 + Math.round(at)) % 4_294_967_296;
    row[ROW.status] = 0b1001;
    row[ROW.ackSeq] = i < 5 ? -1 : i - 1;
    row[ROW.ackAge_ticks] = i < 5 ? -1 : 3 + Math.floor(random() * 4);
    row[ROW.conversions] = i % 65_536;
    row[ROW.group] = slow === 4 ? 1 : 2;
    row[ROW.drift] = (random() - 0.5) * 1e-4;
    row[ROW.jump_ms] = random() - 0.5;
    row[ROW.state] = 3;
    row[ROW.asked_mA] = i < 5 ? Number.NaN : 1800;
    row[ROW.aim_mA] = 1700 + random();
    row[ROW.ceiling_mA] = 1900 + random() * 10;
    row[ROW.floor_mA] = 400.015;
    row[ROW.expected_mW] = Number.NaN;
    row[ROW.freshLow] = low;
    row[ROW.freshHigh] = slow === 40 ? 1 << 8 : 0;
    row[ROW.gate] = i % 4;
    row.set(values, ROW.values);
    return row;
  };
}

export function publish(ring: Ring, row: Float64Array): void {
  ring.cells.set(row, ring.offset(ring.written));
  ring.publish();
}
