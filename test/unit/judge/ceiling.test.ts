import { describe, expect, test } from "vitest";
import { compilePlan } from "../../../daemon/judge/plan.ts";
import {
  type Curve,
  expectedOutput_mW,
  hostAllows_counts,
  outputTable,
} from "../../../daemon/judge/tables.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import { makerOf } from "../../../daemon/model/ceiling.ts";
import { crystalOutput_mW, floor_mA } from "../../../daemon/physics/crystal.ts";
import { power_mW } from "../../../daemon/physics/diode.ts";
import { BENCH, curveOf, MANIFEST, planOf } from "./bench.ts";

/** A board's table that never limits: its own absolute ceiling everywhere. */
const OPEN: Curve = { x: [0, 10_000], y: [4000, 4000] };

function ceilingAt(bench: Bench, curve: Curve, case_degC: number): { mA: number; maker: string } {
  const compiled = compilePlan(bench, MANIFEST, curve);
  if (!compiled.ok) throw new Error(compiled.problems.join(" "));
  const entry = Math.round(case_degC * 100);
  const { ceiling_mA, maker } = compiled.plan.case;
  return { mA: ceiling_mA[entry] ?? Number.NaN, maker: makerOf(maker[entry] ?? -1) };
}

// Worked by hand from the bench: 30 °C 2000 mA, 40 °C 1600 mA, 50 °C 800 mA; error of the reading
// 0.5 K; bench limit 1900 mA.
describe("derating on the upper edge of the reading", () => {
  test.each([
    [25, 1900, "bench"], // 25.5 is below the first point: 2000, the bench's 1900 is less
    [31.99, 1900, "bench"], // 32.49: 2000 − 2.49 · 40 = 1900.4
    [32.5, 1880, "derating"], // 33: 2000 − 3 · 40
    [34.5, 1800, "derating"], // 35, half way: (2000 + 1600) / 2
    [39.5, 1600, "derating"], // 40, on the point
    [44.5, 1200, "derating"], // 45: (1600 + 800) / 2
    [49.5, 800, "derating"], // 50, on the last point
    [49.51, 0, "derating"], // 50.01 is beyond it
    [70, 0, "derating"],
  ])("at a reading of %d °C the ceiling is %d mA, made by %s", (case_degC, mA, maker) => {
    const ceiling = ceilingAt(BENCH, OPEN, case_degC);
    expect(ceiling.mA).toBeCloseTo(mA, 6);
    expect(ceiling.maker).toBe(maker);
  });

  test("the junction limit: 5 K over 8 K/W leave 0.625 W, which 395.8 mA make", () => {
    const warm = {
      ...BENCH,
      derating: [
        { case_degC: 20, current_mA: 2000 },
        { case_degC: 79, current_mA: 1900 },
      ],
    };
    const ceiling = ceilingAt(warm, OPEN, 74.5);
    // V·I = 1.5 · 0.39578 + 0.2 · 0.39578² = 0.6250 W
    expect(ceiling.mA).toBeCloseTo(395.78, 1);
    expect(ceiling.maker).toBe("junction");
  });

  test("the board's own ceiling", () => {
    const cold = { ...BENCH, limits: { ...BENCH.limits, current_mA: 2200 } };
    const ceiling = ceilingAt(
      { ...cold, derating: [{ case_degC: 60, current_mA: 2200 }] },
      OPEN,
      25,
    );
    // 4000 counts of 0.5 mA; the host stays 1 % below the table, which is that ceiling here.
    expect(ceiling).toEqual({ mA: 1980, maker: "board" });
  });
});

describe("below the board's table, so that the host acts first", () => {
  test.each([
    [3600, 3564], // 1 % is 36
    [1000, 990],
    [150, 148], // 1 % is 1.5: at least two counts
    [101, 99],
    [3, 1],
    [2, 0],
    [0, 0],
  ])("%d counts in the board leave %d", (board, host) => {
    expect(hostAllows_counts(board)).toBe(host);
  });

  test("a table lower than this bench's derating lowers the ceiling with it", () => {
    const curve: Curve = { x: [2000, 4000], y: [3600, 2600] };
    // 30.00 °C: 3100 counts, less 31, is 3069 of 0.5 mA.
    expect(ceilingAt(BENCH, curve, 30).mA).toBe(1534.5);
    // Rounded down between points: 3600 − 0.5 is 3599; less 35.99 is 3563.
    expect(ceilingAt(BENCH, curve, 20.01).mA).toBe(1781.5);
    expect(ceilingAt(BENCH, curve, 19.99).mA).toBe(0);
    expect(ceilingAt(BENCH, curve, 40.01).mA).toBe(0);
  });

  test("at every count of the made table the host is under the board", () => {
    const curve = curveOf();
    const plan = planOf();
    for (let count = curve.x[0] ?? 0; count <= (curve.x.at(-1) ?? 0); count++) {
      const i = curve.x.findLastIndex((x) => x <= count);
      const [x0, x1] = [curve.x[i] ?? 0, curve.x[i + 1] ?? 1];
      const [y0, y1] = [curve.y[i] ?? 0, curve.y[i + 1] ?? curve.y[i] ?? 0];
      const board_mA = 0.5 * Math.floor(y0 + ((count - x0) * (y1 - y0)) / (x1 - x0));
      const host_mA = plan.case.ceiling_mA[count] ?? Number.NaN;
      expect(host_mA).toBeLessThanOrEqual(Math.max(0, Math.min(board_mA * 0.99, board_mA - 1)));
    }
  });
});

describe("floor and expected output from tables", () => {
  const crystal = {
    wavelength_nm: 1064,
    threshold_mW: 250,
    slope: 0.45,
    line_nm: 808.5,
    lineWidth_nm: 4,
    depth: 3,
    pumpDrift_nmPerK: 0.3,
  };
  const pumped = { ...BENCH, crystal, diode: { ...BENCH.diode, wavelength_nm: 805.5 } };

  test("a bare diode's floor is its threshold", () => {
    const plan = planOf();
    expect(plan.case.floor_mA[2500]).toBeCloseTo(400, 3);
    expect(plan.case.floor_mA[3712]).toBeCloseTo(400 * Math.exp(12.12 / 120), 3);
  });

  test("a pumped bench's floor is the crystal's", () => {
    const plan = planOf(pumped);
    for (const case_degC of [15.03, 25.5, 35.27]) {
      const exact = floor_mA(pumped.diode, crystal, case_degC, 2200);
      expect(plan.case.floor_mA[Math.round(case_degC * 100)]).toBeCloseTo(exact, 0);
    }
  });

  test("output between grid points is within 0.5 % of the physics, above 1.2 times the floor", () => {
    const bare = outputTable(BENCH);
    const table = outputTable(pumped);
    for (let case_degC = 12.3; case_degC < 45; case_degC += 1.7) {
      const least = 1.2 * floor_mA(pumped.diode, crystal, case_degC, 2200);
      for (let current = Math.max(600, least); current < 1900; current += 73) {
        const exact = crystalOutput_mW(pumped.diode, crystal, current, case_degC);
        expect(expectedOutput_mW(table, current, case_degC) / exact).toBeCloseTo(1, 2);
        const diode = power_mW(BENCH.diode, current, case_degC);
        expect(Math.abs(expectedOutput_mW(bare, current, case_degC) / diode - 1)).toBeLessThan(
          0.005,
        );
      }
    }
  });

  test("outside the grid nothing is expected", () => {
    expect(expectedOutput_mW(outputTable(BENCH), 1000, -41)).toBeNaN();
    expect(expectedOutput_mW(outputTable(BENCH), 1000, 151)).toBeNaN();
    expect(expectedOutput_mW(outputTable(BENCH), Number.NaN, 25)).toBeNaN();
  });
});
