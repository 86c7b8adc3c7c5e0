import { describe, expect, test } from "vitest";
import { toSetCounts } from "../../../daemon/judge/tables.ts";
import { Rig } from "./rig.ts";

describe("when a permit is made", () => {
  test("for the sample just judged, not closer than 50 ms of the board's clock", () => {
    const rig = new Rig().light(1500);
    rig.permits.length = 0;
    const named: number[] = [];
    for (let i = 0; i < 12; i++) {
      rig.sample();
      if (rig.out.permit === 1) named.push(rig.input.sample.seq);
    }
    expect(rig.permits.map((p) => p.seq)).toEqual(named);
    // Samples come every 20 ms: every third may earn one.
    expect(named.map((seq) => seq - (named[0] ?? 0))).toEqual([0, 3, 6, 9]);
    expect(new Set(rig.permits.map((p) => p.term))).toEqual(new Set([500]));
  });

  test.each<[string, (rig: Rig) => void]>([
    ["where newer samples wait", (rig) => (rig.newest = 0)],
    ["where the port has not drained", (rig) => (rig.portDrained = 0)],
    ["for a sample that is no anchor", (rig) => (rig.anchor = false)],
    ["on a case count outside its range", (rig) => (rig.case_counts = 10_001)],
    ["while the current stands over the ceiling", (rig) => (rig.current_counts = 4500)],
  ])("none %s", (_name, make) => {
    const rig = new Rig().light(1500);
    make(rig);
    rig.permits.length = 0;
    rig.sample(4);
    expect(rig.permits).toEqual([]);
  });

  test("none on a converter that stands still", () => {
    const rig = new Rig().light(1500);
    rig.permits.length = 0;
    for (let i = 0; i < 6; i++) {
      rig.input.sample.conversions--;
      rig.sample();
    }
    expect(rig.permits).toEqual([]);
  });

  test("an old or repeated sample is not judged at all", () => {
    const rig = new Rig().light(1500);
    rig.permits.length = 0;
    rig.key = false;
    rig.now_ms += 100;
    rig.again();
    rig.input.sample.seq -= 5;
    rig.again();
    expect(rig.permits).toEqual([]);
    expect(rig.trips()).toEqual([]);
    rig.input.sample.seq += 5;
    rig.sample();
    expect(rig.trips()).toEqual([74]);
  });

  test("after a stall all samples are judged and the newest alone earns one", () => {
    const rig = new Rig().light(1500);
    rig.permits.length = 0;
    rig.newest = 0;
    rig.sample(20);
    rig.newest = 1;
    rig.sample(1);
    expect(rig.permits.map((p) => p.seq)).toEqual([rig.input.sample.seq]);
  });
});

describe("cap and aim", () => {
  test("the cap is the ceiling in counts, rounded down; the aim is what was asked", () => {
    const rig = new Rig().light(1500);
    const { ceiling_mA } = rig.out.view;
    expect(rig.permits.at(-1)).toMatchObject({ cap: Math.floor(ceiling_mA / 0.5), aim: 3000 });
  });

  test("counts are rounded down, but not for the dust of a division", () => {
    const scale = (perCount_mA: number, offset_mA = 0) => ({
      perCount_mA,
      offset_mA,
      absolute_counts: 4000,
    });
    expect(toSetCounts(scale(0.5), 1499.9)).toBe(2999);
    expect(toSetCounts(scale(0.5), 0.49)).toBe(0);
    expect(toSetCounts(scale(0.5), -3)).toBe(0);
    expect(toSetCounts(scale(0.1), 1234.6)).toBe(12_346);
    expect(toSetCounts(scale(0.1, 0.05), 100)).toBe(999);
    expect(toSetCounts(scale(2), 1799.99)).toBe(899);
  });

  test("aim and cap are rounded down by the same rule", () => {
    for (const asked of [0, 0.4, 0.5, 333.3, 1200.24, 1499.99]) {
      const rig = new Rig().light(asked);
      const scale = { perCount_mA: 0.5, offset_mA: 0, absolute_counts: 4000 };
      expect(rig.permits.at(-1)?.aim).toBe(toSetCounts(scale, asked));
    }
  });

  test("the aim waits at zero through the emission delay, then rises by the slew", () => {
    const rig = new Rig().connect();
    rig.arm(1500);
    rig.sample(200);
    expect(new Set(rig.permits.map((p) => p.aim))).toEqual(new Set([0]));
    expect(rig.out.view.delayLeft_ms).toBeGreaterThanOrEqual(0);
    rig.permits.length = 0;
    rig.sample(60);
    for (let i = 1; i < rig.permits.length; i++) {
      const [before, now] = [rig.permits[i - 1], rig.permits[i]];
      const rise = ((now?.aim ?? 0) - (before?.aim ?? 0)) * 0.5;
      expect(rise).toBeLessThanOrEqual((now?.at_ms ?? 0) - (before?.at_ms ?? 0) + 0.5);
    }
    expect(rig.permits.at(-1)?.aim).toBeGreaterThan(2000);
  });

  test("the emission delay is counted down", () => {
    const rig = new Rig().connect();
    rig.arm(1500);
    rig.sample(50);
    expect(rig.out.view.delayLeft_ms).toBeCloseTo(3000, -2);
    expect(rig.out.view.flags & 32).toBe(32);
    rig.sample(200);
    expect(rig.out.view.delayLeft_ms).toBe(0);
    expect(rig.out.view.flags & 32).toBe(0);
  });

  test("a set goes down at once and up by the slew", () => {
    const rig = new Rig().light(1500);
    rig.request("set", 500);
    rig.sample(3);
    expect(rig.permits.at(-1)?.aim).toBe(1000);
    rig.request("set", 1500);
    rig.sample(30);
    expect(rig.permits.at(-1)?.aim).toBeLessThan(2400);
  });

  test("while a reading is injected the aim may only fall", () => {
    const rig = new Rig().light(1000);
    rig.injected = true;
    rig.request("set", 1400);
    rig.sample(50);
    expect(rig.permits.at(-1)?.aim).toBe(2000);
    rig.request("set", 800);
    rig.sample(5);
    expect(rig.permits.at(-1)?.aim).toBe(1600);
  });
});
