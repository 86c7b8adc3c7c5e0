import { describe, expect, test } from "vitest";
import type { CrystalPart, DiodePart } from "../../../daemon/model/bench.ts";
import {
  absorbed_mW,
  absorbedShare,
  crystalFloor_mA,
  crystalOutput_mW,
  floor_mA,
  pump_nm,
  residualPump_mW,
} from "../../../daemon/physics/crystal.ts";
import { power_mW, threshold_mA } from "../../../daemon/physics/diode.ts";

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
const crystal: CrystalPart = {
  wavelength_nm: 1064,
  threshold_mW: 330,
  slope: 0.45,
  line_nm: 808.5,
  lineWidth_nm: 3.6,
  depth: 6,
  pumpDrift_nmPerK: 0.3,
};

describe("absorption", () => {
  test("on the line all but exp(−depth) is absorbed; half a width away the exponent halves", () => {
    expect(absorbedShare(crystal, 808.5)).toBeCloseTo(1 - Math.exp(-6), 12);
    expect(absorbedShare(crystal, 808.5 + 1.8)).toBeCloseTo(1 - Math.exp(-3), 12);
    expect(absorbedShare(crystal, 808.5 - 1.8)).toBeCloseTo(1 - Math.exp(-3), 12);
  });
  test("the pump drifts by 0.3 nm a kelvin of its junction", () => {
    expect(pump_nm(diode, crystal, 35)).toBeCloseTo(807.1, 9);
  });
  test("absorbed and passed light are the whole of the pump", () => {
    const passed = residualPump_mW(diode, crystal, 1500, 33, 1);
    expect(absorbed_mW(diode, crystal, 1500, 33) + passed).toBeCloseTo(
      power_mW(diode, 1500, 33),
      9,
    );
  });
  test("without voltage the junction is taken as warm as the case", () => {
    const unknown = { ...diode, v0_mV: null };
    const share = absorbedShare(crystal, pump_nm(diode, crystal, 33));
    expect(absorbed_mW(unknown, crystal, 1500, 33)).toBeCloseTo(
      power_mW(diode, 1500, 33) * share,
      9,
    );
  });
});

describe("floor", () => {
  test.each([10, 15, 20, 25, 30, 35, 40, 45])(
    "at %f °C it is what a scan in steps of 0.1 mA finds",
    (case_degC) => {
      let scanned = Number.POSITIVE_INFINITY;
      for (let tenths = 3000; tenths <= 22_000; tenths += 1) {
        if (crystalOutput_mW(diode, crystal, tenths / 10, case_degC) > 0) {
          scanned = tenths / 10;
          break;
        }
      }
      const floor = crystalFloor_mA(diode, crystal, case_degC, 2200);
      expect(Math.abs(floor - scanned)).toBeLessThanOrEqual(0.1);
    },
  );
  test("it is U-shaped in temperature", () => {
    const at = (case_degC: number): number => crystalFloor_mA(diode, crystal, case_degC, 2200);
    expect(at(20)).toBeGreaterThan(at(30));
    expect(at(45)).toBeGreaterThan(at(30));
  });
  test("a case too warm for any current has none", () => {
    expect(crystalFloor_mA(diode, crystal, 70, 2200)).toBe(Number.POSITIVE_INFINITY);
    expect(crystalFloor_mA(diode, crystal, 25, 100)).toBe(Number.POSITIVE_INFINITY);
  });
  test("more current can put the crystal out again: it warms the pump off the line", () => {
    const narrow = { ...crystal, lineWidth_nm: 1.2, depth: 2 };
    const floor = crystalFloor_mA(diode, narrow, 30, 2200);
    expect(crystalOutput_mW(diode, narrow, floor + 20, 30)).toBeGreaterThan(0);
    expect(crystalOutput_mW(diode, narrow, 2200, 30)).toBe(0);
  });
  test("without a crystal the floor is the diode's threshold", () => {
    expect(floor_mA(diode, null, 33, 2200)).toBe(threshold_mA(diode, 33));
  });
});
