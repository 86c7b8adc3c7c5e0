import { describe, expect, test } from "vitest";
import { ANSWER } from "../../../daemon/judge/records.ts";
import { newState, restoreLatch } from "../../../daemon/judge/state.ts";
import { planOf } from "./bench.ts";
import { Rig } from "./rig.ts";

const kinds = (rig: Rig): string[] => rig.told.map((event) => event.kind);

describe("from nothing to light and back", () => {
  test("offline, standby, armed, emitting, standby", () => {
    const rig = new Rig();
    expect(rig.stateName).toBe("offline");
    rig.connect();
    expect(rig.stateName).toBe("standby");
    expect(rig.arm(1500)).toBe("none");
    expect(rig.stateName).toBe("armed");
    rig.sample(10);
    expect(rig.permits.length).toBeGreaterThan(0);
    rig.sample(390);
    expect(rig.stateName).toBe("emitting");
    expect(rig.out.view.current_mA).toBe(1500);
    expect(rig.request("dark")).toBe("none");
    expect(rig.out.dark).toBe(0);
    expect(rig.stateName).toBe("standby");
    rig.sample(10);
    expect(kinds(rig)).toEqual(["connected", "armed", "emitting", "dark"]);
    expect(rig.trips()).toEqual([]);
  });

  test("no permit before the board says that it is armed, none after dark", () => {
    const rig = new Rig().connect();
    rig.request("arm", 1000);
    rig.fact("armed");
    rig.sample(5);
    expect(rig.permits).toEqual([]);
    rig.board.armed = true;
    rig.sample();
    expect(rig.permits.length).toBe(1);
    rig.request("dark");
    rig.sample(50);
    expect(rig.permits.length).toBe(1);
  });

  test("an aim back at zero is armed again, and the session goes on", () => {
    const rig = new Rig().light(1500);
    rig.request("set", 0);
    rig.sample(10);
    expect(rig.stateName).toBe("armed");
    rig.request("set", 800);
    rig.sample(200);
    expect(rig.stateName).toBe("emitting");
    expect(rig.out.view.current_mA).toBe(800);
  });

  test("the board's fall-back when left idle is standby, not a trip", () => {
    const rig = new Rig().connect();
    rig.arm(0);
    rig.sample(10);
    rig.board = { ...rig.board, armed: false, cause: 1 };
    rig.sample();
    expect(rig.stateName).toBe("standby");
    expect(rig.events("dark").map((e) => e.hazard)).toEqual([1]);
  });

  test("stop leaves a trip behind where light was on, and nothing where it was dark", () => {
    const lit = new Rig().light(1000);
    lit.request("stop", 85);
    expect([lit.out.dark, lit.stateName, lit.state.cause]).toEqual([85, "tripped", 85]);
    const dark = new Rig().connect();
    dark.request("stop", 85);
    expect([dark.out.dark, dark.stateName]).toEqual([0, "standby"]);
    expect(dark.trips()).toEqual([]);
  });
});

describe("reasons against arming", () => {
  const refusals: [string, (rig: Rig) => void][] = [
    ["key-off", (rig) => (rig.key = false)],
    ["loop-open", (rig) => (rig.loop = false)],
    ["no-curve", (rig) => (rig.curve = false)],
    ["lockout", (rig) => (rig.lockout = true)],
    ["above-ceiling", (rig) => (rig.case_counts = 4500)],
    ["case-warm", (rig) => (rig.case_counts = 5000)],
    ["sensor", (rig) => (rig.case_counts = 10_001)],
    ["sensor", (rig) => (rig.photodiode_counts = -1)],
  ];
  test.each(refusals)("%s", (refusal, make) => {
    const rig = new Rig().connect();
    make(rig);
    rig.sample(10);
    expect(rig.arm(1500)).toBe(refusal);
    expect(rig.stateName).toBe("standby");
    expect(rig.answers.at(-1)?.answer).toBe(ANSWER.refused);
    expect(rig.events("refused").length).toBe(1);
  });

  test("a current above the ceiling, with the highest that is allowed", () => {
    const rig = new Rig().connect();
    const ceiling = rig.out.view.ceiling_mA;
    expect(rig.arm(ceiling + 0.1)).toBe("above-ceiling");
    expect(rig.out.answerValue).toBe(ceiling);
    expect(rig.arm(ceiling)).toBe("none");
  });

  test.each([-1, Number.NaN])("a current of %d", (current) => {
    expect(new Rig().connect().arm(current)).toBe("below-zero");
  });

  test("while offline, tripped, armed, or with an exchange under way", () => {
    expect(new Rig().arm(1000)).toBe("offline");
    const tripped = new Rig().light(1000);
    tripped.key = false;
    tripped.sample();
    expect(tripped.arm(1000)).toBe("tripped");
    expect(new Rig().light(1000).arm(1000)).toBe("not-standby");
    const busy = new Rig().connect();
    busy.request("arm", 1000);
    expect(busy.request("arm", 1000)).toBe("busy");
  });

  test("on samples that are older than the term", () => {
    const rig = new Rig().connect();
    rig.now_ms += 501;
    expect(rig.arm(1000)).toBe("offline");
  });

  test("from another machine only after an act at the bench", () => {
    const rig = new Rig().connect();
    expect(rig.arm(1000, "away")).toBe("needs-hand");
    rig.hand = true;
    rig.sample();
    expect(rig.arm(1000, "away")).toBe("none");
  });

  test("the scripted person acts on the built-in bench only, but may always ask for dark", () => {
    const built = new Rig().connect();
    expect(built.arm(1000, "scripted-person")).toBe("none");
    const own = new Rig({ ...planOf(), builtIn: false }).connect();
    expect(own.arm(1000, "scripted-person")).toBe("not-built-in");
    expect(own.arm(1000, "person")).toBe("none");
    own.sample();
    expect(own.request("set", 900, "scripted-person")).toBe("not-built-in");
    expect(own.request("dark", 0, "scripted-person")).toBe("none");
    expect(own.request("reset", 0, "scripted-person")).toBe("not-built-in");
  });
});

describe("how arming ends", () => {
  test("refused by the board", () => {
    const rig = new Rig().connect();
    rig.request("arm", 1000);
    expect(rig.out.answer).toBe(ANSWER.begun);
    rig.fact("arm-refused", 4);
    expect(rig.answers.at(-1)).toEqual({
      id: 1,
      answer: ANSWER.refused,
      refusal: "board",
      value: 4,
    });
    expect(rig.stateName).toBe("standby");
  });

  test("without an answer it is given up after three seconds", () => {
    const rig = new Rig().connect();
    rig.request("arm", 1000);
    const asked = rig.now_ms;
    for (let i = 0; i < 200 && rig.answers.length < 2; i++) rig.sample();
    expect(rig.answers.at(-1)?.refusal).toBe("no-answer");
    expect(rig.now_ms - asked).toBe(3000);
  });

  test("dark asked for meanwhile wins, and a session that opens is closed again", () => {
    const rig = new Rig().connect();
    rig.request("arm", 1000);
    rig.request("dark");
    rig.fact("armed");
    expect(rig.out.dark).toBe(0);
    expect(rig.answers.at(-1)?.refusal).toBe("went-dark");
    expect(rig.stateName).toBe("standby");
  });

  test("a board that armed without being asked to is a disagreement", () => {
    const rig = new Rig().connect();
    rig.board.armed = true;
    rig.sample();
    expect(rig.trips()).toEqual([81]);
  });
});

describe("set", () => {
  test("only while armed, from zero to the ceiling", () => {
    const rig = new Rig().connect();
    expect(rig.request("set", 100)).toBe("not-armed");
    rig.arm(1000);
    rig.sample(300);
    expect(rig.request("set", -0.1)).toBe("below-zero");
    expect(rig.request("set", 1882)).toBe("above-ceiling");
    expect(rig.out.answerValue).toBe(rig.out.view.ceiling_mA);
    expect(rig.request("set", 1200)).toBe("none");
    rig.sample(100);
    expect(rig.out.view.current_mA).toBe(1200);
    expect(rig.events("set").map((e) => [e.a, e.b])).toEqual([[1200, 1000]]);
  });
});

describe("a latch found at start", () => {
  test("keeps the bench tripped with its cause, and is not told twice", () => {
    const state = newState();
    restoreLatch(state, 64, true);
    const rig = new Rig(planOf(), state).connect();
    expect([rig.stateName, rig.out.view.cause]).toEqual(["tripped", 64]);
    expect(rig.trips()).toEqual([]);
    expect(rig.arm(1000)).toBe("tripped");
    expect(rig.request("reset", 64)).toBe("none");
    expect(rig.stateName).toBe("standby");
  });

  test("a lit mark without a cause means that the daemon stopped while armed", () => {
    const state = newState();
    restoreLatch(state, 0, true);
    const rig = new Rig(planOf(), state).connect();
    expect([rig.stateName, rig.out.view.cause]).toEqual(["tripped", 84]);
    expect(rig.trips()).toEqual([84]);
  });

  test("neither leaves the bench free", () => {
    const state = newState();
    restoreLatch(state, 1, false);
    restoreLatch(state, -1, false);
    expect(new Rig(planOf(), state).connect().stateName).toBe("standby");
  });
});
