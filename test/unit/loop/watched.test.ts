import { describe, expect, test } from "vitest";
import { meaningOf } from "../../../daemon/loop/meaning.ts";
import { benchWith, STREAM, Watched } from "./watched.ts";

const plain = (text: string): string => text.replace(/[\u00a0\u202f]/g, " ");
const LIT = "I=1.52 T=31.4";
const DARK = "I=0.001 T=25.0";
const HOT = "I=1.52 T=46.0";

describe("a bench that is only watched", () => {
  const bench = benchWith(STREAM);

  test("shows what its current shows, as one watched session, and says what it is not", () => {
    const rig = new Watched(bench).open().say(DARK, 5);
    expect(rig.state).toBe("standby");
    rig.say(LIT, 30);
    expect(rig.state).toBe("emitting");
    const now = rig.snapshot();
    expect(now).toMatchObject({ watchOnly: true, enforcement: "none", asked_mA: null });
    expect(now.current_mA).toBeCloseTo(1520, 6);
    expect(now.case_degC).toBeCloseTo(31.4, 2);
    expect(now.ceiling_mA).toBeCloseTo(1899, -1);
    expect(plain(now.sentence)).toBe(
      "attic is watched, not enforced: 1.52 A flows, the case is at 31.4 °C.",
    );
    expect(now.next).toContain("It watches and warns but cannot enforce");
    const sessions = rig.records.flatMap((r) => (r.kind === "session" ? [r.session] : []));
    expect(sessions).toEqual(["watched"]);
    expect(rig.kinds()).toEqual(["connected", "light-seen"]);
    expect(rig.written).toEqual([]);
  });

  test("a passed limit is told once, as one that nothing here acts on, and never as a trip", () => {
    const rig = new Watched(bench).open().say(LIT, 5).say(HOT, 40);
    expect(rig.state).toBe("emitting");
    expect(rig.kinds().filter((k) => k.startsWith("unenforced"))).toEqual(["unenforced case-over"]);
    expect(rig.kinds().some((k) => k.startsWith("trip"))).toBe(false);
    const told = rig.events.find((e) => e.kind === "unenforced");
    expect(plain(String(told?.data.words))).toBe(
      "The case passed its limit: 46.0 °C, and 45.0 °C is its limit. Nothing here cuts it.",
    );
    expect(rig.snapshot().warnings.map((w) => w.hazard)).toContain("case-over");
    rig.say(LIT, 60);
    expect(rig.snapshot().warnings).toEqual([]);
  });

  test("arm, set and dark are refused as watch-only; nothing is ever written", () => {
    const rig = new Watched(bench).open().say(LIT, 5);
    expect(meaningOf(rig.loop, 100, "")).toMatchObject({ ok: false, reason: "watch-only" });
    for (const verb of ["arm", "set", "dark"] as const) {
      expect(rig.ask(verb)).toMatchObject({ ok: false, reason: "watch-only" });
    }
    rig.loop.request("stop", 0, "person", 0, rig.loop.out.deadline_ms as never);
    expect(rig.written).toEqual([]);
    expect(rig.levels).toEqual([]);
    expect(rig.state).toBe("emitting");
  });

  test("a reset, a pulled cable and silence are told; none of them is a trip", () => {
    const rig = new Watched(bench).open().say(LIT, 5).wait(2500);
    expect(rig.kinds()).toContain("warning sample-gap");
    expect(rig.snapshot().sentence).toContain("Nothing heard from attic");
    rig.loop.closed(rig.now as never, "pulled");
    expect(rig.state).toBe("offline");
    expect(rig.snapshot().next).toContain("its light is not known here");
    rig.open().say(LIT, 2);
    expect(rig.state).toBe("emitting");
    expect(rig.kinds().some((k) => k.startsWith("trip"))).toBe(false);
  });

  test("lines that do not fit are told after a while, with what to do", () => {
    const rig = new Watched(bench).open().say("hello there", 60);
    expect(rig.state).toBe("offline");
    expect(rig.snapshot().link.words).toContain("none fits the stream of the bench file");
  });
});

describe("a cut-off by text", () => {
  const bench = benchWith(`${STREAM}
  cut-off: { kind: text, send: LASER OFF, expect: off }`);

  test("a trip sends it again until the answer comes, latches, and lets go at the reset", () => {
    const rig = new Watched(bench).open().say(LIT, 5).say(HOT, 6);
    expect(rig.state).toBe("tripped");
    expect(rig.written[0]).toBe("LASER OFF\n");
    rig.wait(1100);
    expect(rig.written.length).toBeGreaterThan(2);
    rig.say("laser is off now");
    const sent = rig.written.length;
    rig.say("I=0.001 T=44.0", 20).wait(2000);
    expect(rig.written).toHaveLength(sent);
    expect(rig.state).toBe("tripped");
    expect(rig.snapshot()).toMatchObject({ enforcement: "on-command", watchOnly: false });
    expect(rig.snapshot().enforced).toContain("cuts on command, but not if this computer hangs");
    rig.say(DARK, 30);
    expect(rig.ask("reset", { cause: "case-over" })).toMatchObject({ ok: true });
    expect(rig.state).toBe("standby");
  });

  test("dark by a person cuts and latches; arming stays refused", () => {
    const rig = new Watched(bench).open().say(LIT, 5);
    expect(rig.ask("dark")).toMatchObject({ ok: true });
    expect(rig.written).toEqual(["LASER OFF\n"]);
    expect(rig.state).toBe("tripped");
    expect(rig.ask("arm")).toMatchObject({ reason: "watch-only" });
    // The current still flows: that is told, for nobody may believe that it is dark.
    rig.say(LIT, 30);
    expect(rig.kinds()).toContain("warning dark-current");
  });
});

describe("a cut-off by a line that cuts while asserted", () => {
  const bench = benchWith(`${STREAM}
  cut-off: { kind: rts }`);

  test("opening the port cuts until a person resets; a trip asserts it again", () => {
    const rig = new Watched(bench).open().say(DARK, 3);
    expect(rig.levels[0]).toEqual({ line: "rts", asserted: true });
    expect(rig.state).toBe("tripped");
    expect(rig.snapshot().cause?.id).toBe("cut-at-open");
    expect(rig.ask("reset", { cause: "cut-at-open" })).toMatchObject({ ok: true });
    expect(rig.levels.at(-1)).toEqual({ line: "rts", asserted: false });
    rig.say(LIT, 10);
    expect(rig.state).toBe("emitting");
    rig.say(HOT, 6);
    expect(rig.state).toBe("tripped");
    expect(rig.levels.at(-1)).toEqual({ line: "rts", asserted: true });
  });

  test("a defect of ours asserts it too", () => {
    const rig = new Watched(bench).open().say(DARK, 3);
    rig.ask("reset", { cause: "cut-at-open" });
    rig.loop.emergency(87);
    expect(rig.levels.at(-1)).toEqual({ line: "rts", asserted: true });
  });
});

describe("a one-shot that the judge feeds", () => {
  const bench = benchWith(`${STREAM}
  cut-off: { kind: dtr, mode: toggled }`);

  test("is fed once a judged sample after the reset, and never without one or after a trip", () => {
    const rig = new Watched(bench).open().say(DARK, 5);
    expect(rig.levels).toEqual([]);
    rig.ask("reset", { cause: "cut-at-open" });
    rig.say(LIT, 10);
    expect(rig.levels).toHaveLength(10);
    expect(rig.levels.map((l) => l.asserted).slice(0, 4)).toEqual([true, false, true, false]);
    rig.wait(300).say("some words", 3);
    expect(rig.levels).toHaveLength(10);
    rig.say(HOT, 20);
    expect(rig.state).toBe("tripped");
    const fed = rig.levels.length;
    expect(fed).toBeLessThan(16);
    rig.say(LIT, 20);
    expect(rig.levels).toHaveLength(fed);
    expect(rig.snapshot().enforcement).toBe("toggled");
  });

  test("of several samples read in one go only the newest feeds it", () => {
    const rig = new Watched(bench).open().say(DARK, 5);
    rig.ask("reset", { cause: "cut-at-open" });
    const at = rig.now as never;
    rig.loop.receive([LIT, LIT, LIT].map((line) => ({ line, at })));
    expect(rig.levels).toHaveLength(1);
  });
});
