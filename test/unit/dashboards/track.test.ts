import { describe, expect, test } from "vitest";
import type { SeriesJson } from "../../../daemon/desk/api.ts";
import { isUnknown, rowsOf, Track } from "../../../dashboards/now/track.ts";
import { snapshotOf } from "../../browser/story.ts";

const trace = (t: number[], mean: (number | null)[], max = mean) => ({
  t,
  min: mean,
  mean,
  max,
  n: t.map(() => 1),
});

const answer: SeriesJson = {
  channels: {
    current: trace([1000, 2000, 9000], [10, null, 30]),
    "judge.ceiling": trace([1000, 2000, 9000], [100, 100, 100]),
    "judge.maker": trace([1000], [1.4], [2]),
  },
  gaps: [{ from: 2000, to: 9000 }],
  step_ms: 1000,
};

describe("the past on a page", () => {
  test("of the record: what is not known stays unknown, and a gap is a row of nothing", () => {
    const rows = rowsOf(answer);
    expect(rows.map((r) => r.t)).toEqual([1000, 2000, 2001, 9000]);
    expect(rows[1]?.current).toBeNaN();
    expect(rows.map(isUnknown)).toEqual([false, false, true, false]);
  });

  test("before the first sample there is no gap, and a short pause is none", () => {
    const gaps = [
      { from: -90_000, to: 1000 },
      { from: 1200, to: 1900 },
    ];
    expect(rowsOf({ ...answer, gaps }).map((r) => r.t)).toEqual([1000, 2000, 9000]);
    expect(rowsOf({ channels: {}, gaps, step_ms: 0 })).toEqual([]);
  });

  test("codes are not averaged", () => {
    expect(rowsOf(answer)[0]?.maker).toBe(2);
  });

  test("of the stream: one row a second, and silence leaves a row of nothing", () => {
    const track = new Track();
    for (const at of [0, 300, 900, 1100, 9000]) track.append(snapshotOf("calm", at));
    expect(track.rows.map((r) => r.t)).toEqual([900, 1100, 2100, 9000]);
    expect(track.rows.map(isUnknown)).toEqual([false, false, true, false]);
  });

  test("an offline bench is unknown, not zero", () => {
    const track = new Track();
    track.append({ ...snapshotOf("standby", 0), state: "offline" });
    expect(track.rows.every(isUnknown)).toBe(true);
  });

  test("the record comes before the stream and never over it", () => {
    const track = new Track();
    track.append(snapshotOf("calm", 9500));
    track.append(snapshotOf("calm", 10_500));
    track.remember(answer);
    expect(track.rows.map((r) => r.t)).toEqual([1000, 2000, 2001, 9000, 9500, 10_500]);
  });

  test("a clock set back takes rows of the future away", () => {
    const track = new Track();
    track.append(snapshotOf("calm", 100_000));
    track.append(snapshotOf("calm", 50_000));
    expect(track.rows.map((r) => r.t)).toEqual([50_000]);
  });

  test("rows older than the picture are let go", () => {
    const track = new Track();
    for (let at = 0; at < 3 * 3_600_000; at += 10_000) track.append(snapshotOf("calm", at));
    expect(track.rows.length).toBeLessThan(600);
  });
});
