import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { BAD_LINES_KEPT, LINES_KEPT, RawLog } from "../../../daemon/link/rawlog.ts";
import { Sequence } from "../../../daemon/link/sequence.ts";
import { JUMP_ms, TickClock, WINDOW_ms } from "../../../daemon/link/tick-clock.ts";
import { seal } from "../../../firmware-protocol/line.ts";
import { LinkBench } from "./bench.ts";

const SEED = 20261201;

describe("sample numbers and ticks", () => {
  test.each([
    ["next", [5, 100], [6, 120], "next", 0],
    ["three lost", [5, 100], [9, 180], "next", 3],
    ["over the wrap", [0xffffffff, 0xfffffff0], [0, 4], "next", 0],
    ["two lost over the wrap", [0xffffffff, 0xfffffff0], [2, 50], "next", 2],
    ["again", [5, 100], [5, 100], "duplicate", 0],
    ["older", [5, 100], [3, 60], "reordered", 0],
    ["older over the wrap", [1, 10], [0xffffffff, 0xffffffe2], "reordered", 0],
    ["anew from far", [5000, 100_000], [0, 20], "restarted", 0],
    ["number goes on, tick goes back", [5, 100], [6, 90], "restarted", 0],
    ["two samples in one tick", [5, 100], [6, 100], "next", 0],
    ["number back, tick on", [5, 100], [3, 140], "restarted", 0],
    ["same number, another tick", [5, 100], [5, 120], "restarted", 0],
    ["a leap no loss explains", [5, 100], [0x7000_0000, 120], "restarted", 0],
  ] as const)("%s", (_, before, after, wanted, lost) => {
    const sequence = new Sequence();
    expect(sequence.judge(before[0], before[1])).toBe("first");
    expect(sequence.judge(after[0], after[1])).toBe(wanted);
    expect(sequence.lost).toBe(lost);
  });

  test("a board that started anew after few samples is seen with its second", () => {
    const sequence = new Sequence();
    sequence.judge(30, 600);
    expect(sequence.judge(0, 20)).toBe("reordered");
    expect(sequence.judge(1, 40)).toBe("restarted");
  });

  test("two separate late samples are no restart", () => {
    const sequence = new Sequence();
    sequence.judge(30, 600);
    expect(sequence.judge(28, 560)).toBe("reordered");
    expect(sequence.judge(31, 620)).toBe("next");
    expect(sequence.judge(29, 580)).toBe("reordered");
  });

  test(`unwrapped numbers ascend over any wrap (seed ${SEED})`, () => {
    const steps = fc.array(fc.integer({ min: 1, max: 1000 }), { minLength: 1, maxLength: 60 });
    fc.assert(
      fc.property(fc.integer({ min: 0xfffff000, max: 0xffffffff }), steps, (start, jumps) => {
        const sequence = new Sequence();
        let total = start;
        sequence.judge(start, start);
        for (const jump of jumps) {
          total += jump;
          expect(sequence.judge(total >>> 0, total >>> 0)).toBe("next");
          expect([sequence.seqTotal, sequence.tickTotal]).toEqual([total, total]);
        }
      }),
      { seed: SEED },
    );
  });
});

/** Feeds a clock `seconds` of 50 samples a second from a board that runs at `rate`. */
const runClock = (
  clock: TickClock,
  from_s: number,
  seconds: number,
  rate: number,
  delay: (n: number) => number,
): number => {
  let worstJump = 0;
  for (let n = 0; n < seconds * 50; n += 1) {
    const host_ms = (from_s + n / 50) * 1000;
    clock.sample(Math.round(host_ms * rate), host_ms + delay(n));
    worstJump = Math.max(worstJump, clock.jump_ms);
  }
  return worstJump;
};
const jitter = (n: number): number => 1 + ((n * 7919) % 13) / 4 + (n % 50 === 3 ? 60 : 0);

describe("the board's clock against the host's", () => {
  test.each([0, 0.002, -0.005, 0.03, -0.03])("drift of %f is found under jitter", (drift) => {
    const clock = new TickClock();
    clock.clear(1000);
    const jump = runClock(clock, 0, 20, 1 + drift, jitter);
    expect(Math.abs(clock.drift - drift)).toBeLessThan(0.0005);
    expect(jump).toBe(0);
  });

  test("a stall of reading for two seconds bends nothing", () => {
    const clock = new TickClock();
    clock.clear(1000);
    runClock(clock, 0, 10, 1, jitter);
    const jump = runClock(clock, 10, 2, 1, (n) => 2000 - n * 20);
    runClock(clock, 12, 5, 1, jitter);
    expect(jump).toBe(0);
    expect(Math.abs(clock.drift)).toBeLessThan(0.001);
    expect(clock.delay_ms).toBeLessThan(10);
  });

  test("ticks that jump ahead are told once, with how far", () => {
    const clock = new TickClock();
    clock.clear(1000);
    runClock(clock, 0, 6, 1, () => 2);
    clock.sample(6000 + 500, 6002);
    expect(clock.jump_ms).toBeCloseTo(500, 0);
    clock.sample(6020 + 500, 6022);
    expect(clock.jump_ms).toBe(0);
  });

  test("a first window of stale lines is no jump", () => {
    const clock = new TickClock();
    clock.clear(1000);
    for (let n = 0; n < 20; n += 1) clock.sample(n * 20, 500 + n * 20);
    clock.sample(400, 402);
    expect(clock.jump_ms).toBe(0);
    expect(JUMP_ms).toBeLessThan(WINDOW_ms);
  });

  test("a tick maps to the moment its line would have come at best", () => {
    const clock = new TickClock();
    clock.clear(500);
    for (let n = 0; n < 500; n += 1) clock.sample(n * 40, 7000 + n * 20 + 2 + (n % 5));
    expect(clock.hostTime_ms(500 * 40)).toBeCloseTo(7000 + 10_000 + 2, 1);
  });
});

describe("what the session tells of damage", () => {
  test("lost, duplicate and late samples are named and counted, and only whole ones are judged", () => {
    const bench = new LinkBench().ready();
    const before = bench.samples;
    const kept: string[] = [];
    for (let i = 0; i < 6; i += 1) kept.push(bench.board.sample());
    bench.board.take();
    for (const i of [0, 2, 2, 1, 5]) bench.feed(kept[i] ?? "");
    expect(bench.samples - before).toBe(3);
    expect(bench.told("lost").map((f) => f.value)).toEqual([1, 2]);
    expect(bench.told("duplicate")).toHaveLength(1);
    expect(bench.told("reordered")).toHaveLength(1);
    expect(bench.session.counts).toMatchObject({ lost: 3, duplicate: 1, reordered: 1 });
  });

  test("a late line changes nothing in the record that is judged", () => {
    const bench = new LinkBench().ready();
    bench.feed(seal("<sample 1000 90000 0838 0 - - 1 0 11 12 13 14"));
    const values = [...bench.session.sample.values];
    bench.feed(seal("<sample 999 89980 0838 0 - - 1 0 91 92 93 94"));
    expect([...bench.session.sample.values]).toEqual(values);
    expect(bench.session.sample.seq).toBe(1000);
  });

  test("a reset is named, ends the session, and the board is asked again", () => {
    for (const banner of ["banner", "silent"] as const) {
      const bench = new LinkBench().armed();
      bench.run(4000);
      bench.board.reboot(banner);
      bench.settle();
      bench.run(60);
      expect(bench.told("board-reset")).toHaveLength(1);
      expect(bench.told("board-reset")[0]?.value).toBe(banner === "banner" ? 1 : 2);
      expect(bench.told("introduced")).toHaveLength(2);
      bench.session.permit(bench.session.sample.seq, 1, 1, 500);
      bench.settle();
      expect(bench.bodies("permit")).toEqual([]);
    }
  });

  test("silence is told after three periods, and its end with its length", () => {
    const bench = new LinkBench().ready();
    bench.pass(59);
    expect(bench.told("silence")).toEqual([]);
    bench.pass(441);
    expect(bench.told("silence")).toHaveLength(1);
    expect(bench.told("silence")[0]?.value).toBeCloseTo(60, 0);
    bench.run(20);
    expect(bench.told("back")).toEqual([{ fact: "back", value: 520, text: "" }]);
  });

  test("broken lines are counted by kind, kept, and told at most once a second", () => {
    const bench = new LinkBench().ready();
    const line = bench.board.sample();
    bench.board.take();
    const spoiled = `${line.slice(0, 12)}9${line.slice(13)}`;
    for (let i = 0; i < 50; i += 1) bench.feed(spoiled);
    bench.feed("x".repeat(161));
    bench.feed("<say \u00ff");
    bench.feed(">who 1 90B2");
    bench.feed(seal("<light 1"));
    bench.feed(seal("<yes arm"));
    expect(bench.session.counts).toMatchObject({
      crc: 50,
      long: 1,
      char: 1,
      direction: 1,
      verb: 1,
      form: 1,
    });
    expect(bench.told("garbled").map((f) => f.value)).toEqual([1]);
    bench.run(1100);
    expect(bench.told("garbled").map((f) => f.value)).toEqual([1, 54]);
    expect(bench.session.log.badLines().lines).toHaveLength(55);
    expect(bench.session.rawLines().at(-200)).toBeUndefined();
    expect(bench.session.rawLines().some((l) => l.endsWith("(broken: form)"))).toBe(true);
  });

  test("nothing is queued over a closed port, and orders for it are dropped", () => {
    const bench = new LinkBench().armed();
    bench.session.permit(bench.session.sample.seq, 9, 9, 500);
    bench.session.status();
    bench.session.disconnected(bench.now, "unplugged");
    bench.session.permit(bench.session.sample.seq, 9, 9, 500);
    bench.session.dark(64);
    bench.session.reset(2);
    const sent = bench.sent.length;
    bench.drain();
    expect(bench.sent).toHaveLength(sent);
    bench.session.connected(bench.now);
    bench.drain();
    expect(bench.sent.slice(sent).map((l) => l.split(" ")[0])).toEqual([">who"]);
    expect(bench.session.phase).toBe("asking");
  });

  test("two samples in one go are a defect of the caller, and seen", () => {
    const bench = new LinkBench().ready();
    const one = bench.board.sample();
    const two = bench.board.sample();
    bench.session.feed(one, bench.now);
    expect(() => bench.session.feed(two, bench.now)).toThrow(/before the last one was taken/);
  });
});

describe("raw log", () => {
  test("keeps the last lines of both directions and counts the bad ones it let go", () => {
    const log = new RawLog();
    for (let i = 0; i < LINES_KEPT + 10; i += 1) {
      log.sent(`s${i}`, i);
      log.received(`r${i}`, i);
      log.wasBroken(`r${i}`, "crc", i);
    }
    const lines = log.lines();
    expect(lines).toHaveLength(LINES_KEPT);
    expect(lines.at(-1)).toMatchObject({ line: `r${LINES_KEPT + 9}`, way: "in", broken: "crc" });
    expect(lines.at(-2)).toMatchObject({ way: "out", broken: "" });
    expect(log.badLines().lines).toHaveLength(BAD_LINES_KEPT);
    expect(log.badLines().dropped).toBe(10);
  });
});
