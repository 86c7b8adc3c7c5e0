import { makeCurve } from "../../../daemon/bench-file/curve.ts";
import { compilePlan, type Plan } from "../../../daemon/judge/plan.ts";
import type { Curve } from "../../../daemon/judge/tables.ts";
import {
  type Bench,
  HAZARD_IDS,
  type HazardId,
  type HazardLevels,
} from "../../../daemon/model/bench.ts";
import { defaultLevels } from "../../../daemon/model/hazard-rows.ts";
import type { Channel, Manifest } from "../../../daemon/model/manifest.ts";

/** A diode alone, with round numbers: case = counts / 100 °C, current and set 0.5 mA a count. */

export const TERM_ms = 500;
const times = { rate_perS: 50, term_ms: TERM_ms, darkTime_ms: 600_000 };

const hazards = Object.fromEntries(
  HAZARD_IDS.map((id) => [id, defaultLevels(id, times)]),
) as Record<HazardId, HazardLevels>;

export const BENCH: Bench = {
  name: "bare",
  title: "A diode alone",
  light: "continuous",
  controller: {
    transport: { kind: "built-in", seed: 1 },
    serial: null,
    rate_perS: 50,
    term_ms: TERM_ms,
  },
  diode: {
    wavelength_nm: 808,
    threshold_mA: 400,
    slope_mWpermA: 1,
    ref_degC: 25,
    t0_K: 120,
    t1_K: 350,
    v0_mV: 1500,
    rs_ohm: 0.2,
    absolute_mA: 2200,
    rjc_KperW: 8,
    junction_degC_max: 80,
  },
  crystal: null,
  cooling: null,
  limits: {
    current_mA: 1900,
    slewUp_mAperS: 1000,
    darkTime_ms: times.darkTime_ms,
    recover_K: 1,
    recover_ms: 60_000,
  },
  derating: [
    { case_degC: 30, current_mA: 2000 },
    { case_degC: 40, current_mA: 1600 },
    { case_degC: 50, current_mA: 800 },
  ],
  conversions: {
    case: { version: 1, law: { kind: "linear", perCount: 0.01, offset: 0 }, error: 0.5 },
    photodiode: { version: 1, law: { kind: "linear", perCount: 0.1, offset: 0 }, error: 5 },
  },
  hazards,
  protections: {
    key: true,
    interlockLoop: true,
    emissionWarning: true,
    beamStop: true,
    manualReset: true,
    toggledEnable: true,
  },
  record: { influx: null },
};

const channel = (
  index: number,
  name: string,
  unit: string,
  perCount: number,
  most: number,
): Channel => ({
  index,
  name,
  unit,
  perCount,
  count_min: 0,
  count_max: most,
  group: 0,
});

export const CHANNEL = { set: 0, current: 1, case: 2, photodiode: 3 } as const;

export const MANIFEST: Manifest = {
  id: "00000001",
  protocol: 1,
  firmware: "test-1",
  serial: "TEST-1",
  boot: 3,
  tick_us: 1000,
  absolute_counts: 4000,
  curveCrc: "00000000",
  term_ticks_min: 150,
  term_ticks_max: 10_000,
  fall_ms: 40,
  rate_perS: 50,
  capabilities: ["hand"],
  channels: [
    channel(CHANNEL.set, "set", "mA", 0.5, 4400),
    channel(CHANNEL.current, "current", "mA", 0.5, 5000),
    channel(CHANNEL.case, "case", "degC", 0.01, 10_000),
    channel(CHANNEL.photodiode, "photodiode", "mW", 0.1, 20_000),
  ],
};

/** The table a board would hold for a bench. */
export function curveOf(bench: Bench = BENCH, manifest: Manifest = MANIFEST): Curve {
  const made = makeCurve(bench, manifest);
  if ("problems" in made) throw new Error(made.problems.join(" "));
  return made;
}

/** The plan of a bench that must compile. */
export function planOf(bench: Bench = BENCH, manifest: Manifest = MANIFEST): Plan {
  const compiled = compilePlan(bench, manifest, curveOf(bench, manifest));
  if (!compiled.ok) throw new Error(compiled.problems.join(" "));
  return compiled.plan;
}

/** The bench with every other row silent, so that a test sees this row alone. */
export function onlyRow(id: HazardId, levels: Partial<HazardLevels> = {}): Bench {
  const silent = HAZARD_IDS.map((other) => {
    const row = BENCH.hazards[other];
    if (other === id) return [other, { ...row, ...levels }];
    return [other, other === "sample-gap" ? row : { ...row, warn: null, trip: null }];
  });
  return { ...BENCH, hazards: Object.fromEntries(silent) as Record<HazardId, HazardLevels> };
}
