import fc from "fast-check";
import { describe, expect, test } from "vitest";
import type { Divider, Law } from "../../../daemon/model/conversion.ts";
import {
  direction,
  lawToCount,
  lawToUnit,
  selfHeating_K,
  sensorShare,
} from "../../../daemon/physics/convert.ts";

const seed = 20261201;
const toGround: Divider = { fixed_ohm: 10_000, sensor: "to-ground", full_counts: 16_384 };
const toSupply: Divider = { ...toGround, sensor: "to-supply" };
const ntc: Law = { kind: "ntc", divider: toGround, r25_ohm: 10_000, beta_K: 3950 };
const laws: readonly Law[] = [
  { kind: "linear", perCount: 0.1, offset: -50 },
  { kind: "linear", perCount: -0.1, offset: 900 },
  ntc,
  { ...ntc, divider: toSupply },
  // A set quoted widely for 10 kohm thermistors.
  { kind: "steinhart-hart", divider: toGround, a: 1.129148e-3, b: 2.34125e-4, c: 8.76741e-8 },
  { kind: "steinhart-hart", divider: toSupply, a: 1.129148e-3, b: 2.34125e-4, c: 0 },
  { kind: "platinum", divider: { ...toGround, fixed_ohm: 1000 }, r0_ohm: 1000 },
  { kind: "platinum", divider: { ...toSupply, fixed_ohm: 100 }, r0_ohm: 100 },
];
const name = (law: Law): string =>
  law.kind === "linear" ? `linear ${law.perCount}` : `${law.kind} ${law.divider.sensor}`;

describe.each(laws.map((law) => [name(law), law] as const))("%s", (_name, law) => {
  test("never turns round over all counts, and says its direction", () => {
    const sign = direction(law);
    let before = lawToUnit(law, 0);
    for (let count = 1; count <= 16_384; count += 1) {
      const value = lawToUnit(law, count);
      expect(Number.isNaN(value)).toBe(false);
      if (value !== before && (value - before) * sign <= 0) {
        expect.fail(`turns round at ${count} counts: ${before} then ${value}`);
      }
      before = value;
    }
  });
  test(`count to unit and back (seed ${seed})`, () => {
    fc.assert(
      fc.property(fc.double({ min: 500, max: 15_000, noNaN: true }), (count) => {
        const value = lawToUnit(law, count);
        if (!Number.isFinite(value)) return;
        expect(Math.abs(lawToCount(law, value) - count)).toBeLessThan(1e-5);
      }),
      { seed },
    );
  });
});

describe("sensors at their ends", () => {
  test("a shorted thermistor reads hotter than any case, an open one colder", () => {
    expect(lawToUnit(ntc, 0)).toBe(Number.POSITIVE_INFINITY);
    expect(lawToUnit(ntc, 16_384)).toBe(Number.NEGATIVE_INFINITY);
    expect(lawToUnit({ ...ntc, divider: toSupply }, 16_384)).toBe(Number.POSITIVE_INFINITY);
  });
  test("a law with nonsense constants reads too hot rather than below absolute zero", () => {
    expect(lawToUnit({ ...ntc, beta_K: 1000 }, 1)).toBe(Number.POSITIVE_INFINITY);
  });
  test("the sensor's share of the divider does not depend on which way round it is", () => {
    expect(sensorShare(toGround, 12_288)).toBe(0.75);
    expect(sensorShare(toSupply, 4096)).toBe(0.75);
  });
  test("equal resistors share equally: a 10 kohm thermistor reads 25 °C at half the counts", () => {
    expect(lawToUnit(ntc, 8192)).toBeCloseTo(25, 9);
  });
  test("self-heating: 2.5 V on 10 kohm is 0.625 mW, at 1.5 mW/K 0.417 K", () => {
    expect(selfHeating_K(5000, 10_000, 10_000, 1.5)).toBeCloseTo(0.625 / 1.5, 9);
  });
});
