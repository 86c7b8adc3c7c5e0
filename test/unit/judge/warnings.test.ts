import { describe, expect, test } from "vitest";
import { eventHazardOf, rowOf } from "../../../daemon/judge/hazards.ts";
import type { HazardId } from "../../../daemon/model/bench.ts";
import { onlyRow, planOf } from "./bench.ts";
import { Rig } from "./rig.ts";

interface Case {
  readonly id: HazardId;
  readonly from?: "standby";
  readonly asked?: number;
  readonly at: (rig: Rig) => void;
  readonly below: (rig: Rig) => void;
  readonly after_ms: number;
}

const CASES: Case[] = [
  {
    id: "over-ceiling",
    at: (rig) => (rig.current_counts = 3686), // 98 % of 1880.5 mA is 1842.9
    below: (rig) => (rig.current_counts = 3685),
    after_ms: 10_000,
  },
  {
    id: "follow-high",
    at: (rig) => (rig.currentOff_counts = 60), // 2 %
    below: (rig) => (rig.currentOff_counts = 59),
    after_ms: 1000,
  },
  {
    id: "follow-low",
    at: (rig) => (rig.currentOff_counts = -60),
    below: (rig) => (rig.currentOff_counts = -59),
    after_ms: 1000,
  },
  {
    id: "case-over",
    asked: 500,
    at: (rig) => (rig.case_counts = 4200),
    below: (rig) => (rig.case_counts = 4199),
    after_ms: 5040, // the median turns with the third sample
  },
  {
    id: "tick-drift",
    at: (rig) => (rig.drift = 0.005),
    below: (rig) => (rig.drift = 0.0049),
    after_ms: 60_000,
  },
  {
    id: "dark-current",
    from: "standby",
    at: (rig) => (rig.current_counts = 10), // 5 mA
    below: (rig) => (rig.current_counts = 9),
    after_ms: 1000,
  },
  {
    id: "dark-light",
    from: "standby",
    at: (rig) => (rig.photodiode_counts = 200), // 1 %
    below: (rig) => (rig.photodiode_counts = 199),
    after_ms: 10_000,
  },
  {
    id: "output-low",
    at: (rig) => (rig.output = 0.899),
    below: (rig) => (rig.output = 0.902),
    after_ms: 30_000,
  },
  {
    id: "margin-low",
    asked: 900,
    at: (rig) => (rig.current_counts = 1142), // threshold 400 mA at 25 °C: 30 % are left at 571.4
    below: (rig) => (rig.current_counts = 1143),
    after_ms: 60_000,
  },
  {
    id: "permit-age",
    at: (rig) => {
      rig.input.sample.ackSeq = 1;
      rig.input.sample.ackAge_ticks = 250; // half of 500 ms
    },
    below: (rig) => {
      rig.input.sample.ackSeq = 1;
      rig.input.sample.ackAge_ticks = 249;
    },
    after_ms: 0,
  },
];

function stand(one: Case): Rig {
  const rig = new Rig(planOf(onlyRow(one.id, { trip: null })));
  return one.from === "standby" ? rig.connect() : rig.light(one.asked ?? 1500);
}

describe("each warning fires at its level after its delay, and not just below", () => {
  test.each(CASES)("$id", (one) => {
    const quiet = stand(one);
    one.below(quiet);
    quiet.sample(one.after_ms / 20 + 100);
    expect(quiet.events("warning")).toEqual([]);

    const rig = stand(one);
    one.at(rig);
    rig.sample();
    const first_ms = rig.now_ms;
    rig.sample(one.after_ms / 20);
    const warned = rig.events("warning");
    expect(warned.map((e) => e.hazard)).toEqual([eventHazardOf(rowOf(one.id))]);
    expect((warned[0]?.at_ms ?? 0) - first_ms).toBe(one.after_ms);
    expect(rig.trips()).toEqual([]);
    rig.sample(200);
    expect(rig.events("warning").length, "told once").toBe(1);
  });
});

describe("deadband and off-delay", () => {
  test("a warm case is over only 2 K lower, for two seconds", () => {
    const rig = new Rig(planOf(onlyRow("case-over", { trip: null }))).light(500);
    rig.case_counts = 4300;
    rig.sample(300);
    expect(rig.events("warning").length).toBe(1);
    rig.case_counts = 4001;
    rig.sample(500);
    expect(rig.events("warning-over")).toEqual([]);
    rig.case_counts = 3999;
    rig.sample(102);
    expect(rig.events("warning-over")).toEqual([]);
    rig.sample(1);
    expect(rig.events("warning-over").map((e) => e.hazard)).toEqual([64]);
    rig.case_counts = 4300;
    rig.sample(300);
    expect(rig.events("warning").length).toBe(2);
  });

  test("an interrupted stand begins its delay anew", () => {
    const rig = new Rig(planOf(onlyRow("follow-low", { trip: null }))).light(1500);
    for (let i = 0; i < 10; i++) {
      rig.currentOff_counts = -100;
      rig.sample(45);
      rig.currentOff_counts = 0;
      rig.sample(1);
    }
    expect(rig.events("warning")).toEqual([]);
  });
});

describe("suppressed by design where meaningless", () => {
  test("low output while dark, while ramping, and with a saturated photodiode", () => {
    const dark = new Rig(planOf(onlyRow("output-low"))).connect();
    dark.sample(3000);
    expect([...dark.events("warning"), ...dark.events("trip")]).toEqual([]);
    const ramp = new Rig(planOf(onlyRow("output-low"))).connect();
    ramp.arm(1500);
    ramp.sample(1000);
    expect(ramp.trips()).toEqual([]);
    const saturated = new Rig(planOf(onlyRow("output-low"))).light(1500);
    saturated.output = 0;
    saturated.photodiode_counts = 19_400; // 97 %
    saturated.sample(3000);
    expect([...saturated.events("warning"), ...saturated.trips()]).toEqual([]);
  });

  test("current near the ceiling while it is held there", () => {
    const rig = new Rig(planOf(onlyRow("over-ceiling"))).light(1500);
    rig.case_counts = 4300;
    rig.sample(1000);
    expect(rig.out.view.flags & 1).toBe(1);
    expect(rig.events("warning")).toEqual([]);
    expect(rig.trips()).toEqual([]);
  });

  test("following while the aim moves: a fall is followed with the stage's own lag", () => {
    const rig = new Rig().light(1500);
    rig.request("set", 600);
    rig.sample(3);
    // The drive is down, the averaged reading still comes down.
    rig.current_counts = 2400;
    rig.sample(2);
    rig.current_counts = Number.NaN;
    rig.sample(100);
    expect(rig.trips()).toEqual([]);
  });

  test("current and light that die away after dark", () => {
    const rig = new Rig().light(1500);
    rig.request("dark");
    rig.current_counts = 2000;
    rig.photodiode_counts = 6000;
    rig.sample(3);
    rig.current_counts = 0;
    rig.photodiode_counts = 0;
    rig.sample(100);
    expect(rig.trips()).toEqual([]);
  });
});
