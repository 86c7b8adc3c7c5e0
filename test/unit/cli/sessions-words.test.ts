import { describe, expect, test } from "vitest";
import type { SessionLine } from "../../../daemon/cli/sessions-answers.ts";
import { listLine } from "../../../daemon/cli/sessions-words.ts";

/** One night; what a test does not give is as it may be. */
const night = (over: Partial<SessionLine>): string =>
  listLine({
    ...{ id: 4, run: 1, bench: "north", kind: "lit", started: 0, ended: 25_000, last: 25_000 },
    ...{ length_ms: 25_000, samples: 1250, benchFile: 1, current: null, output: null },
    ...{ trips: 0, notes: 0, tags: [], ...over },
  }).replaceAll("\u00a0", " ");

describe("a line of the list of sessions", () => {
  test("has the unit of the current once where it is one unit, and both where there are two", () => {
    expect(night({ current: { min: 940, max: 1800 } })).toMatch(/ {2}0\.94 to 1\.80 A$/);
    expect(night({ current: { min: 2, max: 1200 } })).toMatch(/ {2}2 mA to 1\.20 A$/);
    expect(night({ current: { min: 1200, max: 1200 } })).toMatch(/ {2}1\.20 A$/);
  });

  test("tells the change of output, but not in thousands of per cent of nearly nothing", () => {
    const output = (first: number, last: number): string =>
      night({ output: { first, last, unit: "mW" } });
    expect(output(500, 437)).toMatch(/\u221212\.6 %$/);
    expect(output(200, 217.6)).toMatch(/\+8\.8 %$/);
    expect(output(0.9, 220)).toMatch(/ > \+100 %$/);
  });
});
