import { describe, expect, test } from "vitest";
import { HAZARD_IDS, type HazardId, type HazardLevels } from "../../../daemon/model/bench.ts";
import { BENCH, onlyRow, planOf } from "./bench.ts";
import { Rig } from "./rig.ts";

/** One row of the table: how to stand just at its level, and just short of it, while lit at 1.5 A. */
interface Case {
  readonly id: HazardId;
  readonly cause: number;
  readonly levels?: Partial<HazardLevels>;
  readonly from?: "lit" | "standby";
  readonly at: (rig: Rig) => void;
  readonly below: (rig: Rig) => void;
  /** From the first sample at the level to dark, ms. */
  readonly within_ms: number;
}

// Current and set are 0.5 mA a count, 1500 mA are 3000 counts; case is 0.01 °C a count; at 25 °C the
// ceiling is 1880.5 mA: the bench's 1900 are 3799 counts in the board's table, less 1 %, down.
const CASES: Case[] = [
  {
    id: "over-ceiling",
    cause: 65,
    at: (rig) => (rig.current_counts = 3799), // 1 % above 1880.5 is 1899.3
    below: (rig) => (rig.current_counts = 3798),
    within_ms: 20,
  },
  {
    id: "follow-high",
    cause: 66,
    at: (rig) => (rig.currentOff_counts = 150), // 5 %
    below: (rig) => (rig.currentOff_counts = 149),
    within_ms: 40,
  },
  {
    id: "follow-low",
    cause: 67,
    at: (rig) => (rig.currentOff_counts = -300), // 10 %
    below: (rig) => (rig.currentOff_counts = -299),
    within_ms: 300,
  },
  {
    id: "case-over",
    cause: 64,
    at: (rig) => (rig.case_counts = 5000),
    below: (rig) => (rig.case_counts = 4999),
    within_ms: 340, // two samples until the median turns, then 0.3 s
  },
  {
    id: "sensor-range",
    cause: 70,
    at: (rig) => (rig.photodiode_counts = 20_001),
    below: (rig) => (rig.photodiode_counts = 20_000),
    within_ms: 100,
  },
  {
    id: "tick-drift",
    cause: 72,
    at: (rig) => (rig.drift = -0.03),
    below: (rig) => (rig.drift = -0.0299),
    within_ms: 10_000,
  },
  {
    id: "key",
    cause: 74,
    at: (rig) => (rig.key = false),
    below: (rig) => (rig.key = true),
    within_ms: 0,
  },
  {
    id: "loop",
    cause: 75,
    at: (rig) => (rig.loop = false),
    below: (rig) => (rig.loop = true),
    within_ms: 0,
  },
  {
    id: "curve-differs",
    cause: 80,
    at: (rig) => (rig.curve = false),
    below: (rig) => (rig.curve = true),
    within_ms: 0,
  },
  {
    id: "output-low",
    cause: 77,
    at: (rig) => (rig.output = 0.499),
    below: (rig) => (rig.output = 0.502),
    within_ms: 1000,
  },
  {
    id: "dark-current",
    cause: 79,
    from: "standby",
    at: (rig) => (rig.current_counts = 40), // 20 mA
    below: (rig) => (rig.current_counts = 39),
    within_ms: 100,
  },
  {
    id: "dark-light",
    cause: 78,
    from: "standby",
    at: (rig) => (rig.photodiode_counts = 1000), // 5 % of 20000
    below: (rig) => (rig.photodiode_counts = 999),
    within_ms: 500,
  },
];

function stand(one: Case): Rig {
  const rig = new Rig(planOf(onlyRow(one.id, one.levels)));
  if (one.from === "standby") return rig.connect();
  return rig.light(1500);
}

describe("each trip fires at its level, in its time, and not just below", () => {
  test.each(CASES)("$id", (one) => {
    const quiet = stand(one);
    one.below(quiet);
    quiet.sample(600);
    expect(quiet.trips()).toEqual([]);

    const rig = stand(one);
    one.at(rig);
    rig.sample();
    const first_ms = rig.now_ms;
    for (let i = 0; i < 600 && rig.trips().length === 0; i++) rig.sample();
    expect(rig.trips()).toEqual([one.cause]);
    expect(rig.darks[0]).toBe(one.cause);
    expect(rig.stateName).toBe("tripped");
    expect(rig.now_ms - first_ms).toBe(one.within_ms);
  });

  test("every row that a sample can trip is among them, or has a test of its own below", () => {
    const elsewhere = new Set<HazardId>([
      "case-open",
      "case-short",
      "sample-gap",
      "controller-reset",
      "margin-low",
      "permit-age",
      "dark-time",
      "link-lost",
    ]);
    const here = new Set(CASES.map((c) => c.id));
    expect(HAZARD_IDS.filter((id) => !here.has(id) && !elsewhere.has(id))).toEqual([]);
  });
});

describe("sensor open and short, by its share of the divider", () => {
  const divider = { fixed_ohm: 10_000, sensor: "to-ground", full_counts: 10_000 } as const;
  const law = { kind: "ntc", divider, r25_ohm: 10_000, beta_K: 3950 } as const;
  const withNtc = (id: HazardId) => ({
    ...onlyRow(id),
    conversions: { ...BENCH.conversions, case: { version: 1, law, error: 0.5 } },
  });

  test.each([
    ["case-open", 68, 9850, 9849],
    ["case-short", 69, 200, 201],
  ] as const)("%s", (id, cause, at, below) => {
    for (const [counts, trips] of [
      [below, []],
      [at, [cause]],
    ] as const) {
      const rig = new Rig(planOf(withNtc(id)));
      rig.case_counts = 5000;
      rig.light(1500);
      expect(rig.stateName).toBe("emitting");
      rig.case_counts = counts;
      rig.sample();
      const first_ms = rig.now_ms;
      const permits = rig.permits.length;
      for (let i = 0; i < 100 && rig.trips().length === 0; i++) rig.sample();
      expect(rig.trips()).toEqual(trips);
      if (trips.length === 0) continue;
      expect(rig.now_ms - first_ms).toBe(100);
      expect(rig.permits.length, "no permit on a reading in doubt").toBe(permits);
    }
  });
});

describe("samples stop", () => {
  test("a warning after a quarter of the term, a trip at the term, each by a deadline", () => {
    const rig = new Rig().light(1500);
    const last_ms = rig.now_ms;
    rig.deadline();
    expect(rig.now_ms - last_ms).toBe(125);
    expect(rig.events("warning").map((e) => e.hazard)).toEqual([71]);
    expect(rig.trips()).toEqual([]);
    rig.deadline();
    expect(rig.now_ms - last_ms).toBe(500);
    expect([rig.out.dark, rig.stateName]).toEqual([71, "tripped"]);
  });

  test("a deadline a millisecond early changes nothing", () => {
    const rig = new Rig().light(1500);
    rig.now_ms += 124;
    rig.elapse();
    expect(rig.events("warning")).toEqual([]);
    rig.now_ms += 375;
    rig.elapse();
    expect(rig.trips()).toEqual([]);
  });

  test("dark, it is only a warning, and over with the next sample", () => {
    const rig = new Rig().connect();
    rig.deadline();
    rig.now_ms += 5000;
    rig.elapse();
    expect(rig.stateName).toBe("standby");
    rig.sample();
    expect(rig.events("warning-over").map((e) => e.hazard)).toEqual([71]);
    expect(rig.out.deadline_ms).toBe(rig.now_ms + 125);
  });
});

describe("clocks", () => {
  test("a tick that runs backwards or jumps trips at once, while lit", () => {
    const back = new Rig().light(1000);
    back.input.sample.tick -= 100;
    back.sample();
    expect(back.trips()).toEqual([72]);
    const jump = new Rig().light(1000);
    jump.jump_ms = 101;
    jump.sample();
    expect(jump.trips()).toEqual([72]);
    const small = new Rig().light(1000);
    small.jump_ms = 100;
    small.sample();
    expect(small.trips()).toEqual([]);
  });

  test("ticks and numbers wrap without being noticed", () => {
    const rig = new Rig();
    rig.input.sample.seq = 2 ** 32 - 200;
    rig.input.sample.tick = 2 ** 32 - 4000;
    rig.connect();
    rig.arm(1000);
    for (let i = 0; i < 600; i++) {
      rig.sample();
      rig.input.sample.seq >>>= 0;
      rig.input.sample.tick >>>= 0;
    }
    expect(rig.trips()).toEqual([]);
    expect(rig.out.view.current_mA).toBe(1000);
    expect(rig.permits.some((p) => p.seq > 2 ** 31)).toBe(true);
    expect(rig.permits.some((p) => p.seq < 1000)).toBe(true);
  });
});

describe("the board resets, the port goes, time at zero runs out", () => {
  test.each([
    ["board-reset", 73],
    ["port-closed", 83],
    ["introduced", 73],
    ["board-changed", 82],
  ] as const)("%s while lit is a trip", (fact, cause) => {
    const rig = new Rig().light(1000);
    rig.fact(fact);
    expect([rig.out.dark, rig.stateName, rig.state.cause]).toEqual([cause, "tripped", cause]);
  });

  test("armed at zero longer than the bench file allows", () => {
    const bench = { ...onlyRow("dark-time", { trip: 10_000 }) };
    const rig = new Rig(planOf(bench)).light(1000);
    rig.request("set", 0);
    rig.sample(500);
    expect(rig.trips()).toEqual([]);
    rig.sample(10);
    expect(rig.trips()).toEqual([86]);
  });
});

describe("board and host disagree", () => {
  test("the board says dark without a cause", () => {
    const rig = new Rig().light(1000);
    rig.board.armed = false;
    rig.sample();
    expect(rig.trips()).toEqual([81]);
  });

  test("a dark that the board does not carry out is repeated with each sample, then a trip", () => {
    const rig = new Rig().light(1000);
    rig.board.obeys = false;
    rig.request("dark");
    rig.sample(24);
    expect(rig.darks).toEqual(Array(25).fill(0));
    expect(rig.stateName).toBe("standby");
    rig.sample(1);
    expect(rig.trips()).toEqual([81]);
    rig.sample(5);
    expect(rig.darks.slice(-5)).toEqual(Array(5).fill(81));
    rig.board.obeys = true;
    rig.sample(2);
    expect(rig.board.tripped).toBe(true);
    expect(rig.out.dark).toBe(-1);
  });

  test("an arming that the board does not show within half a second", () => {
    const rig = new Rig().connect();
    rig.request("arm", 1000);
    rig.fact("armed");
    rig.sample(24);
    expect(rig.trips()).toEqual([]);
    rig.sample(1);
    expect(rig.trips()).toEqual([81]);
  });
});
