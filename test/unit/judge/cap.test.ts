import { describe, expect, test } from "vitest";
import { onlyRow, planOf } from "./bench.ts";
import { Rig } from "./rig.ts";

/** No row warns or trips, so that the cap is seen alone. Lit, the case at 25 °C. */
const calm = (asked_mA = 1500): Rig => new Rig(planOf(onlyRow("sample-gap"))).light(asked_mA);
const flowing = (rig: Rig): number => rig.out.view.current_mA;

describe("a falling ceiling holds the current down at once", () => {
  test("with the next permit, and says so once", () => {
    const rig = calm();
    rig.case_counts = 4100; // 41.5 °C at its edge: 1480 mA, less than the board's by 1 %
    rig.sample(4);
    const { ceiling_mA } = rig.out.view;
    expect(ceiling_mA).toBeGreaterThan(1440);
    expect(ceiling_mA).toBeLessThan(1480);
    expect(flowing(rig)).toBeLessThanOrEqual(ceiling_mA);
    rig.sample(500);
    const capped = rig.events("capped");
    expect(capped.map((e) => [e.a, e.b])).toEqual([[1500, ceiling_mA]]);
    expect(rig.out.view.flags & 1).toBe(1);
    expect(rig.out.view.asked_mA).toBe(1500);
    expect(rig.stateName).toBe("emitting");
  });

  test("a case beyond the derating leaves nothing, and the session stays armed", () => {
    const rig = calm();
    rig.case_counts = 5100;
    rig.sample(10);
    expect(rig.permits.at(-1)).toMatchObject({ cap: 0, aim: 0 });
    expect(rig.stateName).toBe("armed");
  });

  test("noise of the reading lowers the cap and never lifts it", () => {
    const rig = calm();
    let lowest = Number.POSITIVE_INFINITY;
    for (let i = 0; i < 400; i++) {
      rig.case_counts = 4100 + ((i * 7) % 21) - 10;
      rig.sample();
      lowest = Math.min(lowest, rig.out.view.ceiling_mA);
      if (i > 5) expect(flowing(rig)).toBeLessThanOrEqual(rig.out.view.ceiling_mA + 20);
    }
    rig.case_counts = 4100;
    rig.sample(200);
    expect(flowing(rig)).toBeLessThanOrEqual(lowest);
    expect(rig.events("capped").length).toBe(1);
    expect(rig.events("uncapped").length).toBe(0);
  });
});

describe("it comes back only cooler by 1 K, for 60 s, and by the slew", () => {
  const held = (): Rig => {
    const rig = calm(1700);
    rig.case_counts = 4100;
    rig.sample(20);
    return rig;
  };

  test("0.99 K cooler is not enough, however long", () => {
    const rig = held();
    const before = flowing(rig);
    rig.case_counts = 4001;
    rig.sample(6000);
    expect(flowing(rig)).toBe(before);
  });

  test("1 K cooler for 60 s lets it up to the ceiling of then; it stays capped", () => {
    const rig = held();
    const before = flowing(rig);
    rig.case_counts = 4000;
    rig.sample(3000);
    expect(flowing(rig)).toBe(before);
    rig.sample(60);
    expect(flowing(rig)).toBeGreaterThan(before + 60);
    expect(flowing(rig)).toBeLessThanOrEqual(rig.out.view.ceiling_mA);
    expect(rig.out.view.flags & 1).toBe(1);
    expect(rig.events("uncapped")).toEqual([]);
  });

  test("a warm moment in the 60 s begins them anew", () => {
    const rig = held();
    const before = flowing(rig);
    for (let i = 0; i < 4; i++) {
      rig.case_counts = 3900;
      rig.sample(2900);
      rig.case_counts = 4001;
      rig.sample(1);
    }
    expect(flowing(rig)).toBe(before);
  });

  test("once the ceiling is above what is asked it is let up wholly, and says so", () => {
    const rig = held();
    const before = flowing(rig);
    rig.case_counts = 2500;
    rig.sample(3001);
    expect(rig.events("uncapped").map((e) => e.a)).toEqual([1700]);
    rig.sample(6);
    // 1000 mA/s: at most 20 mA a sample.
    expect(flowing(rig)).toBeGreaterThan(before);
    expect(flowing(rig)).toBeLessThanOrEqual(before + 150);
    rig.sample(100);
    expect(flowing(rig)).toBe(1700);
    expect(rig.out.view.flags & 1).toBe(0);
  });

  test("a person who asks for what fits now is not held back", () => {
    const rig = held();
    rig.case_counts = 3950;
    rig.sample(5);
    const ask = Math.floor(rig.out.view.ceiling_mA);
    expect(ask).toBeGreaterThan(flowing(rig) + 50);
    expect(rig.request("set", ask)).toBe("none");
    rig.sample(200);
    expect(flowing(rig)).toBeCloseTo(ask, 0);
    expect(rig.out.view.flags & 1).toBe(0);
  });
});

describe("the forecast", () => {
  test("the slope of the last minute, and the time until the ceiling meets what is asked", () => {
    const rig = calm();
    expect(rig.out.view.timeToCap_s).toBeNaN();
    rig.case_counts = 3000;
    // 0.02 K/s from 30 °C; at 1500 mA the ceiling is met where the board's table, less 1 %, is 1500.
    for (let i = 0; i < 70 * 50; i++) {
      rig.case_counts = 3000 + Math.round(i * 0.04);
      rig.sample();
    }
    const { view } = rig.out;
    expect(view.caseSlope_KperS).toBeCloseTo(0.02, 4);
    const { case_degC, ceiling_mA } = rig.plan.case;
    const met = case_degC[ceiling_mA.findIndex((mA, i) => i > 3200 && mA < 1500)] ?? 0;
    expect(view.timeToCap_s).toBeCloseTo((met - view.case_degC) / 0.02, -1);
    expect(view.timeToCap_s).toBeGreaterThan(300);
  });

  test("nothing is told of a steady case, of a cooling one, or beyond half an hour", () => {
    const steady = calm();
    for (let i = 0; i < 70 * 50; i++) {
      steady.case_counts = 3000 + ((i * 13) % 5);
      steady.sample();
    }
    expect(steady.out.view.timeToCap_s).toBeNaN();
    expect(steady.out.view.caseSlope_KperS).toBeCloseTo(0, 4);
    const cooling = calm();
    for (let i = 0; i < 70 * 50; i++) {
      cooling.case_counts = 3500 - Math.round(i * 0.04);
      cooling.sample();
    }
    expect(cooling.out.view.timeToCap_s).toBeNaN();
    expect(cooling.out.view.caseSlope_KperS).toBeCloseTo(-0.02, 4);
    const slow = calm();
    for (let i = 0; i < 70 * 50; i++) {
      slow.case_counts = 2500 + Math.round(i * 0.004);
      slow.sample();
    }
    expect(slow.out.view.timeToCap_s).toBeNaN();
  });

  test("twenty seconds must be known before a slope is told", () => {
    const rig = new Rig(planOf(onlyRow("sample-gap"))).connect();
    rig.sample(19 * 50);
    expect(rig.out.view.caseSlope_KperS).toBeNaN();
    rig.sample(2 * 50);
    expect(rig.out.view.caseSlope_KperS).toBe(0);
  });
});
