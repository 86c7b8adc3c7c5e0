import fc from "fast-check";
import { describe, expect, test } from "vitest";
import type { DiodePart } from "../../../daemon/model/bench.ts";
import {
  derated_mA,
  forward_mV,
  heat_mW,
  junction_degC,
  junctionLimited_mA,
  junctionLimitedLit_mA,
  power_mW,
  slope_mWpermA,
  smallerPositiveRoot,
  threshold_mA,
} from "../../../daemon/physics/diode.ts";

const seed = 20261201;
const diode: DiodePart = {
  wavelength_nm: 804.1,
  threshold_mA: 400,
  slope_mWpermA: 1.05,
  ref_degC: 25,
  t0_K: 120,
  t1_K: 350,
  v0_mV: 1490,
  rs_ohm: 0.2,
  absolute_mA: 2200,
  rjc_KperW: 8,
  junction_degC_max: 80,
};

describe("laws", () => {
  test("at the reference temperature they are the data sheet's figures", () => {
    expect(threshold_mA(diode, 25)).toBe(400);
    expect(slope_mWpermA(diode, 25)).toBe(1.05);
    expect(power_mW(diode, 1800, 25)).toBeCloseTo(1470, 9);
    expect(forward_mV(diode, 1800)).toBeCloseTo(1850, 9);
    expect(heat_mW(diode, 1800, 25)).toBeCloseTo(3330 - 1470, 9);
  });
  test("one T0 warmer the threshold is e times higher, one T1 warmer the slope e times lower", () => {
    expect(threshold_mA(diode, 145)).toBeCloseTo(400 * Math.E, 9);
    expect(slope_mWpermA(diode, 375)).toBeCloseTo(1.05 / Math.E, 9);
  });
  test("under threshold there is no laser light, and without current no voltage", () => {
    expect(power_mW(diode, 399.9, 25)).toBe(0);
    expect(forward_mV(diode, 0)).toBe(0);
  });
  test("what is not known stays not known", () => {
    expect(heat_mW({ ...diode, v0_mV: null }, 1000, 25)).toBeNaN();
    expect(junction_degC({ ...diode, rjc_KperW: null }, 25, 1000)).toBeNaN();
    for (const gap of [
      { v0_mV: null },
      { rs_ohm: null },
      { rjc_KperW: null },
      { junction_degC_max: null },
    ]) {
      expect(junctionLimited_mA({ ...diode, ...gap }, 25)).toBe(Number.POSITIVE_INFINITY);
    }
  });
});

describe(`junction limit (seed ${seed})`, () => {
  const cases = fc.double({ min: -20, max: 79, noNaN: true });
  test("substituted back, the junction is at its limit with all power as heat", () => {
    fc.assert(
      fc.property(cases, (case_degC) => {
        const current = junctionLimited_mA(diode, case_degC);
        const all_mW = (forward_mV(diode, current) * current) / 1000;
        expect(junction_degC(diode, case_degC, all_mW)).toBeCloseTo(80, 6);
      }),
      { seed },
    );
  });
  test("with its light leaving, the same, and the limit is never lower", () => {
    fc.assert(
      fc.property(cases, (case_degC) => {
        const lit = junctionLimitedLit_mA(diode, case_degC);
        expect(junction_degC(diode, case_degC, heat_mW(diode, lit, case_degC))).toBeCloseTo(80, 6);
        expect(lit).toBeGreaterThanOrEqual(junctionLimited_mA(diode, case_degC) - 1e-9);
      }),
      { seed },
    );
  });
  test("a case at the limit or over it leaves no current", () => {
    expect(junctionLimited_mA(diode, 80)).toBe(0);
    expect(junctionLimited_mA(diode, 200)).toBe(0);
  });
  test("without series resistance the quadratic is a line", () => {
    expect(junctionLimited_mA({ ...diode, rs_ohm: 0 }, 30)).toBeCloseTo((50 / 8) * (1e6 / 1490), 6);
  });
});

describe("smaller positive root", () => {
  test.each([
    [1, -3, 2, 1],
    [1, 1, -6, 2],
    [0, 2, -8, 4],
    [1, 3, 2, Number.NaN],
    [1, 0, 1, Number.NaN],
    [1e-12, 1, -5, 5],
  ])("%f x² + %f x + %f", (a, b, c, root) => {
    const got = smallerPositiveRoot(a, b, c);
    if (Number.isNaN(root)) expect(got).toBeNaN();
    else expect(got).toBeCloseTo(root, 6);
  });
});

test(`derating never rises with temperature (seed ${seed})`, () => {
  const points = [
    { case_degC: 28, current_mA: 2100 },
    { case_degC: 42, current_mA: 1540 },
    { case_degC: 50, current_mA: 800 },
  ];
  const temperature = fc.double({ min: -50, max: 120, noNaN: true });
  fc.assert(
    fc.property(temperature, temperature, (a, b) => {
      const cool = derated_mA(points, Math.min(a, b));
      expect(cool).toBeGreaterThanOrEqual(derated_mA(points, Math.max(a, b)));
    }),
    { seed },
  );
});
