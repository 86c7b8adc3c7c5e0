import { describe, expect, test } from "vitest";
import { compilePlan } from "../../../daemon/judge/plan.ts";
import type { Curve } from "../../../daemon/judge/tables.ts";
import type { Bench } from "../../../daemon/model/bench.ts";
import type { Manifest } from "../../../daemon/model/manifest.ts";
import { BENCH, curveOf, MANIFEST } from "./bench.ts";

const CURVE = curveOf();

function problemsOf(bench: Bench, manifest: Manifest, curve: Curve = CURVE): string {
  const compiled = compilePlan(bench, manifest, curve);
  return compiled.ok ? "" : compiled.problems.join("\n");
}

const changed = (name: string, change: object): Manifest => ({
  ...MANIFEST,
  channels: MANIFEST.channels.map((c) => (c.name === name ? { ...c, ...change } : c)),
});

describe("what stands between a bench and a controller is said in words", () => {
  test("a bench that fits has no problem", () => {
    expect(problemsOf(BENCH, MANIFEST)).toBe("");
  });

  test("a channel is missing", () => {
    const channels = MANIFEST.channels.filter((c) => c.name !== "case");
    expect(problemsOf(BENCH, { ...MANIFEST, channels })).toContain('no channel "case"');
  });

  test("a judged channel comes only in turn", () => {
    expect(problemsOf(BENCH, changed("current", { group: 2 }))).toContain(
      '"current" is in group 2',
    );
  });

  test("too slow", () => {
    const found = problemsOf(BENCH, { ...MANIFEST, rate_perS: 49 });
    expect(found).toContain("wants 50 samples a second; the controller sends 49");
    expect(problemsOf(BENCH, { ...MANIFEST, rate_perS: 51 })).toBe("");
  });

  test.each([
    [499, false],
    [500, true],
  ])("a controller that takes terms up to %d ticks", (term_ticks_max, fits) => {
    expect(problemsOf(BENCH, { ...MANIFEST, term_ticks_max }) === "").toBe(fits);
  });

  test.each([
    [501, false],
    [500, true],
  ])("a controller that takes terms from %d ticks", (term_ticks_min, fits) => {
    expect(problemsOf(BENCH, { ...MANIFEST, term_ticks_min }) === "").toBe(fits);
  });

  test("a term under five periods", () => {
    const slow = { ...BENCH, controller: { ...BENCH.controller, rate_perS: 5, term_ms: 900 } };
    expect(problemsOf(slow, { ...MANIFEST, rate_perS: 5 })).toContain("five sample periods");
  });

  test("a calibration that would command more current than the board believes", () => {
    const law = { kind: "linear", perCount: 0.49, offset: 0 } as const;
    const conversions = { ...BENCH.conversions, set: { version: 1, law, error: 0 } };
    expect(problemsOf({ ...BENCH, conversions }, MANIFEST)).toContain("more current would be");
    const safe = { ...law, perCount: 0.51 };
    const lowered = { ...BENCH.conversions, set: { version: 1, law: safe, error: 0 } };
    expect(problemsOf({ ...BENCH, conversions: lowered }, MANIFEST)).toBe("");
  });

  test("a board's table that is no table", () => {
    expect(problemsOf(BENCH, MANIFEST, { x: [1], y: [1] })).toContain("two or more");
    expect(problemsOf(BENCH, MANIFEST, { x: [5, 5], y: [1, 1] })).toContain("does not ascend");
    expect(problemsOf(BENCH, MANIFEST, { x: [1, 5], y: [1, 4001] })).toContain("absolute");
  });

  test("a fall time that holds more samples than are kept", () => {
    expect(problemsOf(BENCH, { ...MANIFEST, fall_ms: 6000 })).toContain("fall time");
  });

  test("a bench limit above the diode's absolute maximum", () => {
    const limits = { ...BENCH.limits, current_mA: 2300 };
    expect(problemsOf({ ...BENCH, limits }, MANIFEST)).toContain("absolute maximum");
  });

  test("a set channel that is a sensor, or in another unit", () => {
    expect(problemsOf(BENCH, changed("set", { unit: "A" }))).toContain("needs it in mA");
    const law = {
      kind: "ntc",
      divider: { fixed_ohm: 1, sensor: "to-ground", full_counts: 2 },
      r25_ohm: 1,
      beta_K: 1,
    } as const;
    const conversions = { ...BENCH.conversions, current: { version: 1, law, error: 0 } };
    expect(problemsOf({ ...BENCH, conversions }, MANIFEST)).toContain("needs it linear");
  });

  test("all problems are told at once", () => {
    const bad = { ...MANIFEST, rate_perS: 10, channels: [] };
    expect(problemsOf(BENCH, bad).split("\n").length).toBeGreaterThanOrEqual(5);
  });
});
