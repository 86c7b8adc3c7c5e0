import type { Manifest } from "../../../daemon/model/manifest.ts";
import { type Ring, ROW } from "../../../daemon/model/ring.ts";

/**
 * Samples of an invented bench for the store's figures: per channel a slow drift, a thermal swing of
 * some minutes, lamp flicker of a fraction of a step, now and then a bump, and a converter's noise of
 * `sigma` steps. Seeded, and any row can be made without those before it.
 */
export const BEGIN_ms = Date.UTC(2026, 0, 10, 20);

const GAUSS_BITS = 16;
const TABLE = gaussTable(1 << GAUSS_BITS);
const FULL_SCALE = 65_535;

/** A table of normal numbers (Box and Muller, 1958) that a hash picks from. */
function gaussTable(size: number): Float64Array {
  const table = new Float64Array(size);
  let state = 20_261_201;
  const random = (): number => {
    state = (Math.imul(state, 1_664_525) + 1_013_904_223) >>> 0;
    return (state + 0.5) / 4_294_967_296;
  };
  for (let i = 0; i < size; i++) {
    table[i] = Math.sqrt(-2 * Math.log(random())) * Math.cos(2 * Math.PI * random());
  }
  return table;
}

function hash(row: number, channel: number): number {
  let h = Math.imul(row ^ (channel << 27), 0x9e3779b1);
  h = Math.imul(h ^ (h >>> 15), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return (h ^ (h >>> 16)) >>> (32 - GAUSS_BITS);
}

/** Count of channel `channel` in row `row` of a recording of `rate_perS`. */
export function count(row: number, channel: number, rate_perS: number, sigma: number): number {
  const t_s = row / rate_perS;
  const slow = 40 * Math.sin(t_s / (9000 + 1700 * channel)) + (t_s / 3600) * (channel - 3);
  const swing = 6 * Math.sin(t_s / (61 + 13 * channel));
  const flicker = 0.2 * Math.sin(2 * Math.PI * 0.37 * t_s);
  const bump = t_s % 7200 < 4 && channel < 4 ? 25 : 0;
  const noise = sigma * (TABLE[hash(row, channel)] as number);
  return Math.round(20_000 + 1000 * channel + slow + swing + flicker + bump + noise);
}

export const manifest = (channels: number, rate_perS: number): Manifest => ({
  id: "0badcafe",
  protocol: 1,
  firmware: "invented",
  serial: "S-1",
  boot: 1,
  tick_us: 100,
  absolute_counts: FULL_SCALE,
  curveCrc: "00000000",
  term_ticks_min: 1500,
  term_ticks_max: 100_000,
  fall_ms: 10,
  rate_perS,
  capabilities: [],
  channels: Array.from({ length: channels }, (_, index) => ({
    index,
    name: `c${index}`,
    unit: "mA",
    perCount: 0.1,
    count_min: 0,
    count_max: FULL_SCALE,
    group: 0,
  })),
});

export interface RowShape {
  readonly channels: number;
  readonly rate_perS: number;
  readonly sigma: number;
}

/** Puts row `row` into the ring as the judging thread would, at an even pace. */
export function publish(ring: Ring, row: number, shape: RowShape): void {
  const { channels, rate_perS, sigma } = shape;
  const cells = ring.cells;
  const at = ring.offset(ring.written);
  const at_ms = (row * 1000) / rate_perS;
  cells.fill(0, at, at + ROW.values);
  cells[at + ROW.input] = row;
  cells[at + ROW.mono_ms] = 5000 + at_ms;
  cells[at + ROW.wall_ms] = BEGIN_ms + at_ms;
  cells[at + ROW.seq] = row;
  cells[at + ROW.tick] = (row * 10_000) / rate_perS;
  cells[at + ROW.status] = 9;
  cells[at + ROW.ackSeq] = row - 1;
  cells[at + ROW.ackAge_ticks] = 20;
  cells[at + ROW.conversions] = row & 0xffff;
  cells[at + ROW.state] = 3;
  cells[at + ROW.asked_mA] = 1800;
  cells[at + ROW.aim_mA] = 1800;
  cells[at + ROW.ceiling_mA] = 1950;
  cells[at + ROW.floor_mA] = 400;
  cells[at + ROW.expected_mW] = Number.NaN;
  cells[at + ROW.freshLow] = 2 ** channels - 1;
  cells[at + ROW.gate] = 3;
  for (let c = 0; c < channels; c++) cells[at + ROW.values + c] = count(row, c, rate_perS, sigma);
  ring.publish();
}

const ORDER = 32;
const MINUTES = 16;

/**
 * Bytes a value of the best linear prediction: of running means of any length and of a predictor of
 * order 32 (N. Levinson, 1946) fitted to each stretch, the entropy of what it leaves, rounded.
 */
export function entropyFloor(shape: RowShape, rows: number): number {
  const stretch = 60 * shape.rate_perS;
  let bits = 0;
  for (let c = 0; c < shape.channels; c++) {
    const stretches = Array.from({ length: MINUTES }, (_, m) => {
      const from = Math.floor(((rows - stretch) * m) / MINUTES);
      return Float64Array.from({ length: stretch }, (__, i) =>
        count(from + i, c, shape.rate_perS, shape.sigma),
      );
    });
    const means = Array.from({ length: 10 }, (_, shift) =>
      entropy(stretches.map((x) => leftByMean(x, 1 / 2 ** shift))),
    );
    bits += Math.min(...means, entropy(stretches.map(leftByLine)));
  }
  return bits / shape.channels / 8;
}

function entropy(left: readonly Float64Array[]): number {
  const counts = new Map<number, number>();
  let n = 0;
  for (const stretch of left) {
    // The first values have nothing to be predicted from.
    for (const value of stretch.subarray(stretch.length >> 3)) {
      counts.set(value, (counts.get(value) ?? 0) + 1);
      n++;
    }
  }
  let bits = 0;
  for (const c of counts.values()) bits -= (c / n) * Math.log2(c / n);
  return bits;
}

function leftByMean(x: Float64Array, gain: number): Float64Array {
  let mean = x[0] as number;
  return x.map((value) => {
    const rest = value - Math.round(mean);
    mean += gain * (value - mean);
    return rest;
  });
}

function leftByLine(x: Float64Array): Float64Array {
  const mean = x.reduce((a, b) => a + b, 0) / x.length;
  const y = x.map((v) => v - mean);
  const a = levinson(
    Float64Array.from({ length: ORDER + 1 }, (_, lag) => {
      let sum = 0;
      for (let i = lag; i < y.length; i++) sum += (y[i] as number) * (y[i - lag] as number);
      return sum;
    }),
  );
  return x.map((value, i) => {
    let expected = mean;
    for (let k = 1; k <= Math.min(ORDER, i); k++) {
      expected += (a[k] as number) * (y[i - k] as number);
    }
    return value - Math.round(expected);
  });
}

/** Coefficients 1 … ORDER of the predictor with the least squared error for these correlations. */
function levinson(r: Float64Array): Float64Array {
  const a = new Float64Array(ORDER + 1);
  let error = r[0] as number;
  for (let m = 1; m <= ORDER && error > 0; m++) {
    let sum = r[m] as number;
    for (let k = 1; k < m; k++) sum -= (a[k] as number) * (r[m - k] as number);
    const reflection = sum / error;
    const before = a.slice();
    a[m] = reflection;
    for (let k = 1; k < m; k++) {
      a[k] = (before[k] as number) - reflection * (before[m - k] as number);
    }
    error *= 1 - reflection * reflection;
  }
  return a;
}
