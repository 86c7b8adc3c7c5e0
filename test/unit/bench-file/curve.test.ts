import fc from "fast-check";
import { describe, expect, test } from "vitest";
import {
  boardCeiling_mA,
  CURVE_POINTS_MAX,
  curveBytes,
  makeCurve,
  tableCounts,
} from "../../../daemon/bench-file/curve.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import type { Law } from "../../../daemon/model/conversion.ts";
import type { Manifest } from "../../../daemon/model/manifest.ts";
import { lawToUnit, sensorShare } from "../../../daemon/physics/convert.ts";
import { benchOf, NORTH } from "./files.ts";

const seed = 20261201;
const north = benchOf(NORTH);

function board(count_max: number, set_mAperCount: number, absolute_counts = 65_535): Manifest {
  const channel = { count_min: 0, group: 0 };
  return {
    id: "00000001",
    protocol: 1,
    firmware: "test-1",
    serial: "T1",
    boot: 1,
    tick_us: 1000,
    absolute_counts,
    curveCrc: "00000000",
    term_ticks_min: 150,
    term_ticks_max: 10_000,
    fall_ms: 59,
    rate_perS: 50,
    capabilities: [],
    channels: [
      {
        ...channel,
        index: 0,
        name: "set",
        unit: "mA",
        perCount: set_mAperCount,
        count_max: 20_000,
      },
      { ...channel, index: 1, name: "case", unit: "adc", perCount: 1, count_max },
    ],
  };
}

function withCase(law: Law, derating = north.derating): Bench {
  return { ...north, derating, conversions: { case: { version: 1, error: 0.5, law } } };
}

function tableOf(bench: Bench, manifest: Manifest) {
  const made = makeCurve(bench, manifest);
  if ("problems" in made) throw new Error(made.problems.join(" "));
  return made;
}

/** At every possible count: never above the exact ceiling, and at most the stated loss below. */
function expectBelow(bench: Bench, manifest: Manifest): void {
  const table = tableOf(bench, manifest);
  const [set, caseChannel] = manifest.channels;
  const law = bench.conversions.case?.law;
  if (set === undefined || caseChannel === undefined || law === undefined) expect.fail();
  expect(table.x.length).toBeLessThanOrEqual(CURVE_POINTS_MAX);
  for (let count = 0; count <= caseChannel.count_max; count += 1) {
    const reading = lawToUnit(law, count);
    const share = law.kind === "linear" ? 0.5 : sensorShare(law.divider, count);
    const seen = Number.isFinite(reading) && share > 0.02 && share < 0.985;
    const exact_mA = seen ? boardCeiling_mA(bench, reading) : 0;
    const allowed = Math.min(manifest.absolute_counts, exact_mA / set.perCount);
    const got = tableCounts(table, count);
    if (got > allowed) expect.fail(`${count} counts: ${got} above ${allowed}`);
    if (got < Math.floor(allowed) - table.loss_counts) {
      expect.fail(`${count} counts: ${got} more than ${table.loss_counts} under ${allowed}`);
    }
  }
}

const ntc = (full_counts: number, sensor: "to-ground" | "to-supply" = "to-ground"): Law => ({
  kind: "ntc",
  divider: { fixed_ohm: 10_000, sensor, full_counts },
  r25_ohm: 10_000,
  beta_K: 3950,
});

describe("under the exact ceiling at every count, and near it", () => {
  test.each<[string, Law, number, number]>([
    ["north: 14 bits, 0.5 mA", ntc(16_384), 16_383, 0.5],
    ["10 bits, 2 mA", ntc(1024), 1023, 2],
    ["16 bits, 0.16 mA", ntc(65_536), 65_535, 0.16],
    ["thermistor to supply", ntc(16_384, "to-supply"), 16_383, 0.5],
    ["linear, warm upward", { kind: "linear", perCount: 0.01, offset: -40 }, 16_383, 0.5],
    ["linear, warm downward", { kind: "linear", perCount: -0.01, offset: 120 }, 16_383, 0.5],
    [
      "Pt1000",
      {
        kind: "platinum",
        divider: { fixed_ohm: 1000, sensor: "to-ground", full_counts: 16_384 },
        r0_ohm: 1000,
      },
      16_383,
      0.5,
    ],
  ])("%s", (_name, law, count_max, set_mAperCount) => {
    const bench = withCase(law);
    const manifest = board(count_max, set_mAperCount);
    expectBelow(bench, manifest);
    // Loss under a thousandth of the bench limit: the curve costs nobody anything.
    expect(tableOf(bench, manifest).loss_counts * set_mAperCount).toBeLessThanOrEqual(2);
  });
  test(`any derating (seed ${seed})`, () => {
    const steps = fc.array(
      fc.record({
        warmer: fc.integer({ min: 1, max: 20 }),
        less: fc.integer({ min: 0, max: 600 }),
      }),
      { minLength: 1, maxLength: 8 },
    );
    fc.assert(
      fc.property(
        steps,
        fc.constantFrom(0.16, 0.5, 2),
        fc.integer({ min: 800, max: 60_000 }),
        (list, per, most) => {
          let case_degC = 15;
          let current_mA = 2100;
          const derating = [{ case_degC, current_mA }];
          for (const { warmer, less } of list) {
            case_degC += warmer;
            current_mA = Math.max(0, current_mA - less);
            derating.push({ case_degC, current_mA });
          }
          expectBelow(withCase(ntc(4096), derating), board(4095, per, most));
        },
      ),
      { seed, numRuns: 60 },
    );
  });
});

describe("the table", () => {
  const table = tableOf(north, board(16_383, 0.5));
  test("x ascends, y stays under bench limit and board limit", () => {
    for (let n = 1; n < table.x.length; n += 1) {
      expect(table.x[n]).toBeGreaterThan(table.x[n - 1] ?? 0);
    }
    expect(Math.max(...table.y)).toBe(3800);
    expect(Math.max(...tableOf(north, board(16_383, 0.5, 3000)).y)).toBe(3000);
  });
  test("an open, a shorted and a too warm sensor allow nothing", () => {
    for (const count of [0, 200, 4000, 16_200, 16_383]) expect(tableCounts(table, count)).toBe(0);
  });
  test("its bytes are x then y, low byte first", () => {
    expect([...curveBytes({ x: [258, 4000], y: [1, 65_535] })]).toEqual([
      2, 1, 1, 0, 0xa0, 0x0f, 255, 255,
    ]);
  });
});

describe("the board's ceiling, by hand", () => {
  test("is taken at the upper edge of the reading: 0.5 K under a point it is that point's", () => {
    expect(boardCeiling_mA(north, 41.5)).toBeCloseTo(1540, 9);
    expect(boardCeiling_mA(north, 49.6)).toBe(0);
    expect(boardCeiling_mA({ ...north, conversions: {} }, 41.5)).toBeCloseTo(1560, 9);
  });
  test("is never above bench limit, absolute maximum or junction limit", () => {
    expect(boardCeiling_mA(north, 20)).toBe(1900);
    const diode = { ...north.diode, absolute_mA: 1700 };
    expect(boardCeiling_mA({ ...north, diode }, 20)).toBe(1700);
    // 52.5 °C of junction on a case of 20.5 °C: 32 K / 8 K/W is 4 W, which is 1490 mV·I + 0.2 ohm·I².
    const warm = { ...north.diode, junction_degC_max: 52.5 };
    const root_mA = (-1490 + Math.sqrt(1490 ** 2 + 4 * 0.2 * 4e6)) / 0.4;
    const limits = { ...north.limits, current_mA: 5000 };
    const derating = [{ case_degC: 50, current_mA: 5000 }];
    const free = { ...north, limits, derating, diode: { ...warm, absolute_mA: 5000 } };
    expect(boardCeiling_mA(free, 20)).toBeCloseTo(root_mA, 6);
  });
});

describe("refused in words", () => {
  const problems = (bench: Bench, manifest: Manifest): string => {
    const made = makeCurve(bench, manifest);
    return "problems" in made ? made.problems.join(" ") : "";
  };
  test("no case channel, no set channel", () => {
    expect(problems(north, { ...board(1023, 0.5), channels: [] })).toMatch(/named case.*named set/);
  });
  test("a case channel that nobody can read in °C", () => {
    expect(problems({ ...north, conversions: {} }, board(1023, 0.5))).toMatch(/channels\.case/);
  });
  test("a set channel that is not in mA", () => {
    const manifest = board(1023, 0.5);
    const channels = manifest.channels.map((channel) => ({ ...channel, unit: "V" }));
    expect(problems(north, { ...manifest, channels })).toMatch(/needs mA/);
  });
  test("a case channel that never reads as warm as the trip", () => {
    const manifest = board(16_383, 0.5);
    const channels = manifest.channels.map((channel) => ({ ...channel, count_min: 6000 }));
    expect(problems(north, { ...manifest, channels })).toMatch(/reads at most 37\.\d.*trips at 50/);
  });
  test("a bench that allows no current", () => {
    const cold = north.derating.map((point) => ({ ...point, current_mA: 0 }));
    expect(problems({ ...north, derating: cold }, board(1023, 0.5))).toMatch(/no current/);
  });
});
