import { describe, expect, test } from "vitest";
import { derated_mA } from "../../daemon/physics/diode.ts";

/**
 * Derating by hand: 2.10 A to 28 °C, 1.54 A at 42 °C (0.04 A/K between), 0.80 A at 50 °C
 * (0.0925 A/K between), nothing above. Worked on paper; no published source.
 */
const points = [
  { case_degC: 28, current_mA: 2100 },
  { case_degC: 42, current_mA: 1540 },
  { case_degC: 50, current_mA: 800 },
];

describe("derating, worked by hand", () => {
  test.each([
    [-40, 2100],
    [28, 2100],
    [28.5, 2080],
    [35, 1820],
    [35.5, 1800],
    [41, 1580],
    [42, 1540],
    [43, 1447.5],
    [46, 1170],
    [50, 800],
    [50.0001, 0],
    [90, 0],
    [Number.POSITIVE_INFINITY, 0],
    [Number.NEGATIVE_INFINITY, 2100],
    [Number.NaN, 0],
  ])("%f °C allows %f mA", (case_degC, current_mA) => {
    expect(derated_mA(points, case_degC)).toBeCloseTo(current_mA, 9);
  });
  test("without points nothing is allowed", () => expect(derated_mA([], 20)).toBe(0));
});
