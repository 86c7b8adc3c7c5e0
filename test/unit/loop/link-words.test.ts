import { describe, expect, test } from "vitest";
import { Snapshot } from "../../../daemon/control/api.ts";
import { linkWords } from "../../../daemon/loop/link-words.ts";
import { meaningOf } from "../../../daemon/loop/meaning.ts";
import { snapshotOf } from "../../../daemon/loop/snapshot.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { Chain, north } from "./bench.ts";

/** A file that says nothing of the case sensor: no curve can be made for the board's raw counts. */
const misfit = {
  ...north,
  conversions: Object.fromEntries(
    Object.entries(north.conversions).filter(([name]) => name !== "case"),
  ),
};

function snapshot(c: Chain, port = ""): Snapshot {
  const made = snapshotOf(c.loop, {
    wall_ms: 0,
    now_ms: c.lockstep.now(),
    port,
    recorder: { behind_ms: 0, words: "" },
  });
  // As it travels: what is not a number becomes null, and null is only allowed where it is meant.
  return Snapshot.parse(JSON.parse(JSON.stringify(made)));
}

/** Lines that came over the wire, in place of the board's own. */
function hear(c: Chain, ...lines: string[]): void {
  c.loop.receive(lines.map((line) => ({ line, at: c.lockstep.now() })));
}

describe("what stands between the daemon and its board", () => {
  test("a snapshot before any board was met is whole, and tells what the port says", () => {
    const c = new Chain();
    const s = snapshot(c, "/dev/none does not exist. Try 2 follows in 0.3 s.");
    expect(s.link.words).toBe("/dev/none does not exist. Try 2 follows in 0.3 s.");
    expect(s.delayLeft_ms).toBe(0);
    expect(meaningOf(c.loop, 1000, "no port.").words).toBe("no port.");
  });

  test("nothing, once the board is ready", () => {
    const c = new Chain();
    c.ready();
    expect(snapshot(c).link.words).toBe("");
  });

  test("a bench file that does not fit: told in status, as an event, and when somebody would arm", () => {
    const c = new Chain({ bench: misfit });
    c.run(3000);
    const words = /case channel .* Add channels\.case\./;
    expect(snapshot(c).link.words).toMatch(words);
    expect(c.events.find((e) => e.hazard === "bench-file")?.data.words).toMatch(words);
    expect(meaningOf(c.loop, 1000, "")).toMatchObject({ ok: false, reason: "offline" });
    expect(meaningOf(c.loop, 1000, "").words).toMatch(words);
    expect(c.arm(1000).ok).toBe(false);
  });

  test("another version: both versions are told, until a board of ours introduces itself", () => {
    const c = new Chain();
    hear(c, seal("<hello 2 future-board"));
    expect(linkWords(c.loop, "")).toContain("speaks version 2");
    c.lockstep.disconnect("unplugged");
    c.lockstep.connect(c.loop);
    c.ready();
    expect(linkWords(c.loop, "")).toBe("");
  });

  test("lines that nobody can read: told from the fifth on, and no more after a reconnection", () => {
    const c = new Chain();
    hear(c, "$GP", "?", "x");
    expect(linkWords(c.loop, "")).toBe("");
    hear(c, "\u00ff\u00fe", "hello");
    expect(linkWords(c.loop, "")).toContain("5 of them could not be read");
    c.lockstep.disconnect("unplugged");
    c.lockstep.connect(c.loop);
    expect(linkWords(c.loop, "")).toBe("");
  });

  test("every link fact that is told is a sentence", () => {
    const c = new Chain();
    c.ready();
    c.light(1000);
    c.lockstep.disconnect("unplugged");
    const told = c.events.filter((e) => e.kind === "link").map((e) => String(e.data.words));
    expect(told.length).toBeGreaterThan(0);
    for (const words of told) expect(words).toMatch(/^[A-Z].*\.$/);
  });
});

describe("what arming would mean", () => {
  test("a current that fits is read back; nothing is changed by it", () => {
    const c = new Chain();
    c.ready();
    const meant = meaningOf(c.loop, 1200, "");
    expect(meant.ok).toBe(true);
    expect(meant.words).toMatch(
      /^1\.20\u00a0A gives about .* at 1\u202f?064\u00a0nm, with .* of room/,
    );
    expect(c.state).toBe("standby");
    expect(meaningOf(c.loop, 0, "").words).toContain("without light");
    expect(meaningOf(c.loop, 300, "").words).toContain("That is under threshold");
  });

  test("what would be refused is refused, with the reason that arming would give", () => {
    const c = new Chain();
    c.ready();
    const high = meaningOf(c.loop, 2500, "");
    expect(high).toMatchObject({ ok: false, reason: "above-ceiling" });
    expect(high.highest_mA).toBeGreaterThan(1000);
    expect(high.words).toBe(c.arm(2500).words);
    expect(meaningOf(c.loop, -1, "").reason).toBe("below-zero");
    expect(meaningOf(c.loop, Number.NaN, "").reason).toBe("below-zero");
    c.light(1000);
    expect(meaningOf(c.loop, 1200, "").reason).toBe("not-standby");
    c.lockstep.disconnect("unplugged");
    expect(meaningOf(c.loop, 1200, "").reason).toBe("tripped");
  });
});
