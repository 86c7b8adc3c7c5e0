import { describe, expect, test } from "vitest";
import { CURVE_TRIES } from "../../../daemon/link/curve-load.ts";
import { WHO_TRIES } from "../../../daemon/link/introduction.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { CURVE, LinkBench } from "./bench.ts";

const LAST_SEQ = (bench: LinkBench): number => bench.session.sample.seq;
const permit = (bench: LinkBench): void => {
  bench.session.permit(LAST_SEQ(bench), 900, 850, 500);
  bench.settle();
};

describe("introduction", () => {
  test("connect, introduce, load the curve, ready", () => {
    const bench = new LinkBench().ready();
    expect(bench.names()).toEqual(["port-open", "introduced", "curve-loaded"]);
    expect(bench.session.phase).toBe("ready");
    expect(bench.session.manifest?.serial).toBe("BS-0001");
    expect(bench.board.curve).toEqual(CURVE);
    expect(bench.samples).toBeGreaterThan(0);
  });

  test("a curve that the board holds already is not loaded again", () => {
    const bench = new LinkBench();
    bench.board.curve = CURVE;
    bench.ready();
    expect(bench.bodies("stage")).toEqual([]);
    expect(bench.told("curve-loaded")).toHaveLength(1);
    expect(bench.session.phase).toBe("ready");
  });

  test("never relies on the banner: a board that boots late is asked until it answers", () => {
    const bench = new LinkBench();
    bench.up = false;
    bench.connect();
    bench.pass(4000);
    expect(bench.bodies("who").length).toBeGreaterThan(1);
    bench.up = true;
    bench.pass(3000);
    expect(bench.session.manifest).not.toBeNull();
  });

  test("a reset on connect, as opening a port makes it on many boards, is one, and is asked past", () => {
    const bench = new LinkBench();
    bench.board.mute.add("who");
    bench.connect();
    bench.pass(300);
    bench.board.mute.clear();
    bench.board.reboot("banner");
    bench.settle();
    expect(bench.told("board-reset").map((f) => f.value)).toEqual([1]);
    expect(bench.bodies("who")).toHaveLength(2);
    expect(bench.session.manifest).not.toBeNull();
  });

  test("asking ends after a count, says so, and a sign of a board starts it again", () => {
    const bench = new LinkBench();
    bench.up = false;
    bench.connect();
    bench.pass(60_000);
    expect(bench.bodies("who")).toHaveLength(WHO_TRIES);
    expect(bench.told("no-answer")).toEqual([{ fact: "no-answer", value: WHO_TRIES, text: "who" }]);
    expect(bench.session.phase).toBe("stopped");
    bench.up = true;
    bench.run(40);
    expect(bench.session.manifest).not.toBeNull();
  });

  test("something that sends good samples and never introduces itself is given up for good", () => {
    const bench = new LinkBench();
    bench.board.mute.add("who");
    bench.connect();
    bench.run(60_000);
    expect(bench.bodies("who")).toHaveLength(WHO_TRIES);
    expect(bench.session.counts.early).toBeGreaterThan(100);
  });

  test("a torn first line and a torn introduction cost a try and no more", () => {
    const bench = new LinkBench();
    bench.up = false;
    bench.connect();
    bench.feed("mple 5 100 0004 0 - - 0 0 1 2 3 4 1234");
    bench.feed(seal("<channel 3 photodiode adc 1e0 0 1023 0"));
    bench.feed(seal("<end 6 12345678"));
    bench.up = true;
    bench.pass(2000);
    expect(bench.session.manifest).not.toBeNull();
    expect(bench.session.counts.direction).toBe(1);
  });

  test("another version stops the link and says what to do", () => {
    const bench = new LinkBench();
    bench.board.mute.add("who");
    bench.connect();
    bench.feed(seal("<hello 2 bs-later-9 BS-1"));
    bench.pass(60_000);
    expect(bench.told("wrong-version")[0]?.value).toBe(2);
    expect(bench.told("wrong-version")[0]?.text).toMatch(/Flash firmware/);
    expect(bench.bodies("who")).toHaveLength(1);
    const refused = new LinkBench();
    refused.board.mute.add("who");
    refused.connect();
    refused.feed(seal("<no who version 3"));
    expect(refused.told("wrong-version")[0]?.value).toBe(3);
  });

  test("an introduction that stays unusable names its problems", () => {
    const bench = new LinkBench();
    bench.board.hello = { rate: "0" };
    bench.connect();
    bench.pass(60_000);
    expect(bench.told("not-introduced")[0]?.text).toMatch(/rate is 0/);
    expect(bench.session.phase).toBe("stopped");
  });

  test("a board that tripped on being asked is asked again", () => {
    const bench = new LinkBench();
    bench.board.refuse.set("who", "state");
    bench.connect();
    bench.board.refuse.clear();
    bench.pass(2000);
    expect(bench.session.manifest).not.toBeNull();
  });

  test("another serial number is told, also against the first one met", () => {
    const expected = new LinkBench({ serial: "BS-9999" });
    expected.ready();
    expect(expected.told("board-changed")[0]?.text).toMatch(/BS-0001 answered; BS-9999/);
    const bench = new LinkBench().ready();
    bench.session.disconnected(bench.now, "unplugged");
    bench.board.hello = { serial: "BS-0002" };
    bench.ready();
    expect(bench.names().filter((n) => n === "board-changed")).toHaveLength(1);
    expect(bench.names().indexOf("board-changed")).toBeLessThan(
      bench.names().lastIndexOf("introduced"),
    );
  });
});

describe("curve", () => {
  test("waits while the board is tripped, and is loaded after the reset", () => {
    const bench = new LinkBench();
    bench.board.state = "tripped";
    bench.board.cause = 5;
    bench.ready();
    expect(bench.session.phase).toBe("loading");
    expect(bench.bodies("stage")).toEqual([]);
    bench.session.reset(5);
    bench.run(60);
    expect(bench.told("reset-done")[0]?.value).toBe(5);
    expect(bench.session.phase).toBe("ready");
  });

  test("a lost answer starts the whole load anew; it ends after a count", () => {
    const bench = new LinkBench();
    bench.board.mute.add("commit");
    bench.ready();
    bench.run(800);
    bench.board.mute.clear();
    bench.run(2000);
    expect(bench.bodies("stage")).toHaveLength(2);
    expect(bench.session.phase).toBe("ready");
    const dead = new LinkBench();
    dead.board.mute.add("point");
    dead.ready();
    dead.run(20_000);
    expect(dead.bodies("stage")).toHaveLength(CURVE_TRIES);
    expect(dead.told("curve-failed")[0]?.text).toMatch(
      /at "point", after 3 tries: the board did not/,
    );
    expect(dead.session.phase).toBe("introduced");
  });

  test("a curve that reads back differently is not taken as loaded", () => {
    const bench = new LinkBench();
    bench.board.mute.add("readback");
    bench.ready();
    bench.feed(seal(`<curve 0 210 2100 4 00000001`));
    bench.run(20_000);
    expect(bench.told("curve-loaded")).toEqual([]);
    expect(bench.told("curve-failed")).toHaveLength(1);
  });

  test.each([
    ["above the board's ceiling", { x: [1, 2], y: [2201, 0] }, /allows 2201 counts/],
    ["not ascending", { x: [2, 2], y: [1, 0] }, /does not lie above/],
    ["one point", { x: [2], y: [1] }, /1 points/],
    ["a fraction", { x: [1.5, 2], y: [1, 0] }, /whole counts/],
  ])("a table that is unusable is never sent: %s", (_, points, wanted) => {
    const bench = new LinkBench({ curve: () => points }).ready();
    expect(bench.told("curve-failed")[0]?.text).toMatch(wanted);
    expect(bench.bodies("stage")).toEqual([]);
  });

  test("another curve, named while connected, is loaded in standby only", () => {
    const bench = new LinkBench().armed();
    const other = { x: [100, 200], y: [1000, 0] };
    bench.session.loadCurve(other, bench.now);
    bench.run(100);
    expect(bench.board.curve).toEqual(CURVE);
    bench.session.dark(0);
    bench.run(100);
    expect(bench.board.curve).toEqual(other);
    expect(bench.session.phase).toBe("ready");
  });
});

describe("arming", () => {
  test("ask, offer, answer, session; then permits carry its token", () => {
    const bench = new LinkBench().armed();
    expect(bench.told("armed")).toEqual([{ fact: "armed", value: 0, text: "0BADF00D" }]);
    permit(bench);
    expect(bench.bodies("permit")).toEqual([`permit 0BADF00D ${LAST_SEQ(bench)} 900 850 500`]);
    expect(bench.board.state).toBe("emitting");
  });

  test("a refusal ends it, with its reason in words", () => {
    const bench = new LinkBench().ready();
    bench.board.refuse.set("ask", "key");
    bench.session.arm();
    bench.settle();
    expect(bench.told("arm-refused")[0]?.text).toBe("the key is off");
    bench.board.refuse.set("ask", "no-such-word");
    bench.session.arm();
    bench.settle();
    expect(bench.told("arm-refused")[1]).toMatchObject({ value: -1 });
  });

  test("refused here while the link is not ready", () => {
    const bench = new LinkBench({ curve: () => null }).ready();
    expect(bench.session.phase).toBe("introduced");
    bench.session.arm();
    bench.settle();
    expect(bench.bodies("ask")).toEqual([]);
    expect(bench.told("arm-refused")).toHaveLength(1);
  });

  test("no offer: told once; an offer that comes late is not answered", () => {
    const bench = new LinkBench().ready();
    bench.board.mute.add("ask");
    bench.session.arm();
    bench.run(1000);
    expect(bench.told("no-answer")).toEqual([{ fact: "no-answer", value: 1, text: "ask" }]);
    bench.feed(seal("<offer arm 1A2B3C4D 8 3"));
    expect(bench.bodies("arm")).toEqual([]);
    expect(bench.session.counts.unexpected).toBe(1);
  });

  test("a lost answer to the arm line ends in a dark: nobody stays armed unasked", () => {
    const lost = new LinkBench().ready();
    lost.board.mute.add("arm");
    lost.session.arm();
    lost.settle();
    lost.board.state = "armed";
    lost.run(1000);
    expect(lost.told("no-answer")[0]?.text).toBe("arm");
    expect(lost.bodies("dark")).toContain("dark 0");
    expect(lost.board.state).toBe("standby");
    lost.feed(seal("<yes arm 0BADF00D"));
    lost.session.permit(LAST_SEQ(lost), 9, 9, 500);
    lost.settle();
    expect(lost.bodies("permit")).toEqual([]);
  });
});

describe("permit", () => {
  test("leaves only for the newest sample, and only where it is an anchor", () => {
    const bench = new LinkBench().armed();
    bench.session.permit(LAST_SEQ(bench) - 1, 900, 850, 500);
    bench.board.anchors = false;
    bench.run(20);
    permit(bench);
    expect(bench.bodies("permit")).toEqual([]);
    expect(bench.told("anchor-missing")).toHaveLength(2);
  });

  test("never leaves without a session", () => {
    const bench = new LinkBench().ready();
    permit(bench);
    expect(bench.bodies("permit")).toEqual([]);
    expect(bench.told("permit-refused")[0]?.text).toMatch(/no session/);
  });

  test("a session that the board ended is ended here too", () => {
    const bench = new LinkBench().armed();
    bench.board.state = "tripped";
    bench.run(20);
    permit(bench);
    expect(bench.bodies("permit")).toEqual([]);
  });

  test("a newer permit takes the place of one that was not taken yet", () => {
    const bench = new LinkBench().armed();
    const n = LAST_SEQ(bench);
    bench.session.permit(n, 900, 850, 500);
    bench.session.permit(n, 800, 750, 500);
    bench.settle();
    expect(bench.bodies("permit")).toEqual([`permit 0BADF00D ${n} 800 750 500`]);
  });

  test("a refusal is told and counted", () => {
    const bench = new LinkBench().armed();
    bench.feed(seal("<no permit stale 12"));
    expect(bench.told("permit-refused")[0]?.text).toMatch(/newer sample/);
    expect(bench.session.counts.permitsRefused).toBe(1);
  });
});

describe("dark", () => {
  test("goes before queued lines and takes permits and arm lines with it", () => {
    const bench = new LinkBench().armed();
    bench.session.status();
    bench.session.permit(LAST_SEQ(bench), 900, 850, 500);
    bench.session.dark(65);
    bench.session.permit(LAST_SEQ(bench), 900, 850, 500);
    const first = bench.session.take();
    expect(first).toMatchObject({ kind: "send", urgent: true });
    expect(first?.kind === "send" ? first.line : "").toMatch(/^>dark 65 [0-9A-F]{4}\n$/);
    bench.settle();
    expect(bench.bodies("permit")).toEqual([]);
    const asking = new LinkBench().ready();
    asking.session.arm();
    asking.session.dark(0);
    asking.settle();
    expect(asking.bodies("ask")).toEqual([]);
  });

  test("is repeated with each sample until the sample says dark", () => {
    const bench = new LinkBench().armed();
    permit(bench);
    bench.up = false;
    bench.session.dark(64);
    bench.run(200);
    expect(bench.bodies("dark").length).toBeGreaterThanOrEqual(11);
    expect(bench.told("dark-confirmed")).toEqual([]);
    bench.up = true;
    bench.run(60);
    expect(bench.told("dark-confirmed")).toEqual([{ fact: "dark-confirmed", value: 64, text: "" }]);
    const said = bench.bodies("dark").length;
    bench.run(1000);
    expect(bench.bodies("dark")).toHaveLength(said);
  });

  test("is repeated by pauses while no sample comes, and that it stays unanswered is told once", () => {
    const bench = new LinkBench().armed();
    bench.up = false;
    bench.session.dark(64);
    bench.pass(60_000);
    expect(bench.bodies("dark")).toHaveLength(50);
    expect(bench.told("no-answer")).toEqual([{ fact: "no-answer", value: 50, text: "dark" }]);
  });

  test("a person's dark does not replace a cause on its way; a cause replaces a person's", () => {
    const bench = new LinkBench().armed();
    bench.up = false;
    bench.session.dark(64);
    bench.session.dark(0);
    bench.settle();
    expect(bench.bodies("dark").at(-1)).toBe("dark 64");
    const other = new LinkBench().armed();
    other.up = false;
    other.session.dark(0);
    other.session.dark(71);
    other.session.dark(64);
    other.settle();
    expect(other.bodies("dark").at(-1)).toBe("dark 71");
  });

  test("can be ordered before anything is known of the board", () => {
    const bench = new LinkBench();
    bench.board.mute.add("who");
    bench.connect();
    bench.session.dark(0);
    bench.settle();
    expect(bench.bodies("dark")).toEqual(["dark 0"]);
  });
});

describe("reset and status", () => {
  test("a refusal names its reason; no answer is told", () => {
    const bench = new LinkBench().ready();
    bench.board.refuse.set("reset", "cause");
    bench.session.reset(3);
    bench.settle();
    expect(bench.told("reset-refused")[0]?.text).toMatch(/latched cause/);
    bench.board.refuse.clear();
    bench.board.mute.add("reset");
    bench.session.reset(3);
    bench.run(1000);
    expect(bench.told("no-answer")[0]).toMatchObject({ text: "reset" });
  });

  test("the board's own counters", () => {
    const bench = new LinkBench().ready();
    bench.session.status();
    bench.settle();
    expect(bench.session.boardCounts).toMatchObject({ good: 1, crc: 2, uptime: 9 });
  });
});
