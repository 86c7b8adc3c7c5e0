import type { Bench } from "../model/bench.ts";
import type { Law } from "../model/conversion.ts";
import { lawToCount } from "../physics/convert.ts";
import type { Plant } from "./plant.ts";

/** Channels of the built-in board, in the order of its manifest. */
export const NORTH_CHANNELS = {
  set: 0,
  current: 1,
  case: 2,
  photodiode: 3,
  forward: 4,
  sink: 5,
  ambient: 6,
  fan: 7,
  supply: 8,
} as const;

/** Scales of the built-in board's linear channels, units per count. */
export const CURRENT_mAperCOUNT = 0.16;
export const SET_mAperCOUNT = 0.5;
const FORWARD_VperCOUNT = 2e-4;
const SUPPLY_VperCOUNT = 5e-4;
const FULL_COUNTS = 16383;

const NTC: Law = {
  kind: "ntc",
  divider: { fixed_ohm: 10_000, sensor: "to-ground", full_counts: 16384 },
  r25_ohm: 10_000,
  beta_K: 3950,
};

/**
 * What the board's converter makes of the plant: noise of about a count, a bow and a ripple that no
 * calibration knows, and whole numbers.
 */
export class Converters {
  readonly values = new Int32Array(9);
  readonly #photodiode: Law;

  constructor(bench: Bench) {
    this.#photodiode = bench.conversions.photodiode?.law ?? {
      kind: "linear",
      perCount: 0.05,
      offset: 0,
    };
  }

  /** One unaveraged conversion of the current, counts. */
  current(plant: Plant): number {
    return this.#count(plant, plant.current_mA / CURRENT_mAperCOUNT, 4);
  }

  /** One averaged set of readings, into `values`. */
  read(plant: Plant, drive_counts: number): Int32Array {
    const v = this.values;
    v[NORTH_CHANNELS.set] = drive_counts;
    v[NORTH_CHANNELS.current] = this.#count(plant, plant.current_mA / CURRENT_mAperCOUNT, 1);
    v[NORTH_CHANNELS.case] = this.#count(plant, lawToCount(NTC, plant.heat.case_degC), 1.5);
    const light_counts = lawToCount(this.#photodiode, plant.detected_mW);
    v[NORTH_CHANNELS.photodiode] = this.#count(plant, light_counts, 1 + light_counts * 0.0015);
    const forward_V = plant.current_mA > 0 ? 1.49 + 0.0002 * plant.current_mA : 0;
    v[NORTH_CHANNELS.forward] = this.#count(plant, forward_V / FORWARD_VperCOUNT, 1);
    v[NORTH_CHANNELS.sink] = this.#count(plant, lawToCount(NTC, plant.heat.sink_degC), 1.5);
    v[NORTH_CHANNELS.ambient] = this.#count(plant, lawToCount(NTC, plant.room_degC), 1.5);
    v[NORTH_CHANNELS.fan] = Math.max(0, Math.round(plant.fan * 2400 + 8 * plant.chance.normal()));
    const supply_V = 5.02 - 0.00003 * plant.current_mA;
    v[NORTH_CHANNELS.supply] = this.#count(plant, supply_V / SUPPLY_VperCOUNT, 1);
    return v;
  }

  #count(plant: Plant, ideal: number, noise: number): number {
    const part = ideal / FULL_COUNTS;
    const bow = 3 * 4 * part * (1 - part);
    const ripple = Math.sin(ideal / 37);
    const read = Math.round(ideal + bow + ripple + noise * plant.chance.normal());
    return Math.min(FULL_COUNTS, Math.max(0, read));
  }
}
