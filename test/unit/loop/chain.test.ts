import { describe, expect, test } from "vitest";
import { Chain, north } from "./bench.ts";

/** The term and the fall of the stage: with a dead host, light ends within these. */
const TERM_ms = north.controller.term_ms;
const FALL_ms = 20;

describe("the chain on a simulated clock", () => {
  test("connects dark, loads its curve, arms, holds the emission delay, and reaches its current", () => {
    const c = new Chain();
    c.ready();
    expect(c.state).toBe("standby");
    expect(c.lit).toBe(false);
    expect(c.arm(1200).words).toBe(
      "north is armed for 1.20\u00a0A; light comes after the emission delay.",
    );
    const delay_ms = c.until(() => c.lit, 6000);
    expect(delay_ms).toBeGreaterThanOrEqual(3000);
    expect(delay_ms).toBeLessThanOrEqual(5000);
    c.until(() => c.state === "emitting" && c.board.plant.current_mA > 1190, 10_000);
    expect(c.board.plant.current_mA).toBeLessThan(1210);
    expect(c.loop.out.view.output_mW).toBeGreaterThan(50);
  });

  test("a dead host: dark within the term and the fall, latched", () => {
    const c = new Chain();
    c.light(1000);
    c.deaf = true;
    expect(c.until(() => !c.lit, TERM_ms + FALL_ms)).toBeLessThanOrEqual(TERM_ms + FALL_ms);
    c.deaf = false;
    c.until(() => c.state === "tripped", 200);
    c.run(20_000);
    expect(c.lit).toBe(false);
    expect(c.events.filter((e) => e.kind === "trip")).toHaveLength(1);
  });

  test("a pulled cable: tripped, and tripped still when it is plugged in again", () => {
    const c = new Chain();
    c.light(1000);
    c.lockstep.disconnect("the cable is out");
    expect(c.state).toBe("tripped");
    c.run(2000);
    expect(c.lit).toBe(false);
    c.lockstep.connect(c.loop);
    c.ready();
    c.run(5000);
    expect(c.state).toBe("tripped");
    expect(c.lit).toBe(false);
    const refused = c.arm(1000);
    expect(refused.reason).toBe("tripped");
    expect(c.reset("case-over").reason).toBe("wrong-cause");
    expect(c.reset("link-lost").ok).toBe(true);
    expect(c.state).toBe("standby");
    c.run(5000);
    expect(c.lit).toBe(false);
    c.light(1000);
  });

  test("a warming case: the ceiling comes down, the current follows it at once, and none flows above", () => {
    const c = new Chain();
    c.light(1700);
    c.board.plant.room_degC = 23;
    c.board.plant.fan = 0.3;
    c.until(() => c.events.some((e) => e.kind === "capped"), 900_000);
    for (let i = 0; i < 200; i++) {
      c.run(100);
      const { ceiling_mA, maker } = c.loop.out.view;
      expect(c.board.plant.current_mA).toBeLessThanOrEqual(ceiling_mA * 1.01);
      expect(maker).toBe(0);
    }
    expect(c.state).toBe("emitting");
  }, 60_000);

  test("a case over its limit: dark at once, with the cause kept", () => {
    const c = new Chain();
    c.light(600);
    c.board.plant.heat.case_degC = 55;
    c.board.plant.heat.sink_degC = 55;
    const ms = c.until(() => !c.lit, 1000);
    expect(ms).toBeLessThanOrEqual(400);
    c.until(() => c.state === "tripped", 200);
    const trips = c.events.filter((e) => e.kind === "trip");
    expect(trips).toHaveLength(1);
    expect(["case-over", "board-case-over"]).toContain(trips[0]?.hazard);
  });

  test.each([
    ["key", "key-off"],
    ["loop", "loop-open"],
  ] as const)("the %s opened: cut within 10 ms by the board", (hand, cause) => {
    const c = new Chain();
    c.light(600);
    c.board.hands[hand] = false;
    // The stage's own fall comes on top of the cut.
    expect(c.until(() => !c.lit, 100)).toBeLessThanOrEqual(10 + FALL_ms);
    c.until(() => c.state === "tripped", 500);
    expect(c.events.find((e) => e.kind === "trip")?.hazard).toBe(cause);
  });

  test("a bench file is adopted only while dark, and not while somebody is arming", () => {
    const c = new Chain();
    c.ready();
    expect(c.loop.mayAdopt).toBe(true);
    c.asking.ask(
      { id: 1, verb: "arm", current_mA: 600, asker: "person" },
      c.lockstep.now(),
      () => {},
    );
    // The board answers with the curve it holds now: another file would light with the old one.
    expect(c.state).toBe("standby");
    expect(c.loop.mayAdopt).toBe(false);
    c.until(() => c.state === "armed", 1000);
    expect(c.loop.mayAdopt).toBe(false);
    c.ask({ id: 2, verb: "dark", asker: "person" });
    c.run(1000);
    expect(c.loop.mayAdopt).toBe(true);
  });

  test("a defect of our own: dark at once past the judge, and no line after it", () => {
    const c = new Chain();
    c.light(600);
    c.loop.emergency(87);
    expect(c.until(() => !c.lit, 200)).toBeLessThanOrEqual(2 + FALL_ms);
    const lines = c.written.length;
    c.run(5000);
    expect(c.written).toHaveLength(lines);
    expect(c.lit).toBe(false);
  });

  test("dark by a person: standby, and nothing to reset", () => {
    const c = new Chain();
    c.light(600);
    expect(c.ask({ id: 1, verb: "dark", asker: "person" }).ok).toBe(true);
    expect(c.until(() => !c.lit, 200)).toBeLessThanOrEqual(2 + FALL_ms);
    c.until(() => c.state === "standby", 200);
    expect(c.events.some((e) => e.kind === "trip")).toBe(false);
  });

  test("a current above the ceiling is refused with the highest that is allowed", () => {
    const c = new Chain();
    c.light(600);
    const refused = c.ask({ id: 1, verb: "set", current_mA: 2100, asker: "person" });
    expect(refused.ok).toBe(false);
    expect(refused.reason).toBe("above-ceiling");
    const highest_mA = refused.highest_mA ?? 0;
    expect(c.ask({ id: 1, verb: "set", current_mA: highest_mA, asker: "person" }).ok).toBe(true);
  });

  test("the scripted person may arm the built-in bench and no other", () => {
    const own = new Chain();
    own.ready();
    expect(own.arm(1000, "scripted-person").ok).toBe(true);
    const transport = { kind: "tcp", host: "127.0.0.1", port: 1 } as const;
    const other = new Chain({
      bench: { ...north, controller: { ...north.controller, transport } },
    });
    other.ready();
    expect(other.arm(1000, "scripted-person").reason).toBe("not-built-in");
    other.run(10_000);
    expect(other.lit).toBe(false);
    expect(other.state).toBe("standby");
  });

  test("a page on another machine arms only after an act at the bench", () => {
    const c = new Chain();
    c.ready();
    expect(c.arm(600, "away").reason).toBe("needs-hand");
    c.board.hands.hand = true;
    c.run(100);
    c.board.hands.hand = false;
    c.run(100);
    expect(c.arm(600, "away").ok).toBe(true);
  });

  test("a daemon that had stopped while armed starts tripped, and says so", () => {
    const latch = { cause: -1, wall: 0, serial: "NORTH-1", lit: true } as never;
    const c = new Chain({ latch });
    c.ready();
    expect(c.state).toBe("tripped");
    expect(c.reset("host-restarted").ok).toBe(true);
  });

  test("another board than the one armed last starts tripped", () => {
    const latch = { cause: -1, wall: 0, serial: "OTHER-9", lit: false } as never;
    const c = new Chain({ latch });
    c.until(() => c.state === "tripped", 3000);
    expect(c.events.find((e) => e.kind === "trip")?.hazard).toBe("board-changed");
  });

  test("the board's tick wraps under light without anybody noticing", () => {
    const c = new Chain({ tick: 0xffffffff - 12_000 });
    c.light(800);
    c.run(30_000);
    expect(c.state).toBe("emitting");
    expect(c.events.filter((e) => e.kind === "trip")).toEqual([]);
  });
});
