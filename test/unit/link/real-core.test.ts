import { describe, expect, test } from "vitest";
import { LinkSession } from "../../../daemon/link/session.ts";
import type { LinkFact } from "../../../daemon/model/link-fact.ts";
import { STATUS } from "../../../daemon/model/sample.ts";
import { type Mono_ms, mono } from "../../../daemon/model/times.ts";
import { FLAT, TestBench } from "../firmware-protocol/north.ts";

/** A session on the real controller core, tick by tick. */
class CoreBench {
  readonly core: TestBench;
  readonly facts: { fact: LinkFact; value: number; text: string }[] = [];
  readonly session = new LinkSession({ serial: null, curve: () => FLAT });
  /** Sends a permit for each sample, at most one in 100 ms. */
  permits: { cap: number; aim: number; term: number } | null = null;
  up = true;
  private lastPermit = 0;
  private read: number;

  constructor(tick = 0) {
    this.core = new TestBench({}, tick);
    this.read = this.core.lines.length;
    this.elapsed = 0;
    this.session.connected(this.now);
    this.drain();
  }

  private elapsed: number;

  get now(): Mono_ms {
    return mono(50_000 + this.elapsed);
  }

  run(ms: number): void {
    for (let i = 0; i < ms; i += 1) {
      this.core.step();
      this.elapsed += 1;
      for (; this.read < this.core.lines.length; this.read += 1) {
        this.session.feed(this.core.lines[this.read] ?? "", this.now);
        this.drain();
      }
      this.session.elapse(this.now);
      this.drain();
    }
  }

  drain(): void {
    for (let item = this.session.take(); item !== null; item = this.session.take()) {
      if (item.kind === "fact") {
        this.facts.push({ fact: item.fact, value: item.value, text: item.text });
      } else if (item.kind === "send") this.send(item.line);
      else this.judged();
    }
  }

  told(fact: LinkFact): { value: number; text: string }[] {
    return this.facts.filter((f) => f.fact === fact);
  }

  get status(): number {
    return this.session.sample.status;
  }

  private judged(): void {
    const { permits } = this;
    if (permits === null || this.elapsed - this.lastPermit < 100) return;
    this.lastPermit = this.elapsed;
    this.session.permit(this.session.sample.seq, permits.cap, permits.aim, permits.term);
  }

  private send(line: string): void {
    if (this.up) this.core.controller.receive(Buffer.from(line, "latin1"));
  }

  /** Armed, past the emission delay, at its aim. */
  emitting(): this {
    this.run(500);
    this.session.arm();
    this.permits = { cap: 2000, aim: 0, term: 500 };
    this.run(200);
    this.permits = { cap: 2000, aim: 1000, term: 500 };
    this.run(8000);
    return this;
  }
}

describe("session and controller core", () => {
  test("introduction, curve, arming, permits, light, dark, all with the real core", () => {
    const bench = new CoreBench();
    bench.run(500);
    expect(bench.session.phase).toBe("ready");
    expect(bench.session.manifest?.firmware).toBe("bs-north-1");
    expect(bench.told("curve-loaded")).toHaveLength(1);
    bench.emitting();
    expect(bench.told("arm-refused")).toEqual([]);
    expect(bench.told("armed")).toHaveLength(1);
    expect(bench.status & STATUS.emitting).not.toBe(0);
    expect(bench.core.controller.drive_counts).toBe(1000);
    expect(bench.session.sample.ackAge_ticks).toBeLessThan(50);
    expect(bench.told("permit-refused")).toEqual([]);
    bench.session.dark(0);
    bench.permits = null;
    bench.run(60);
    expect(bench.core.controller.drive_counts).toBe(0);
    expect(bench.told("dark-confirmed")).toHaveLength(1);
    expect(bench.status & (STATUS.armed | STATUS.tripped)).toBe(0);
  });

  test("permits stop: the board trips by itself, the session sees it, and reset names the cause", () => {
    const bench = new CoreBench().emitting();
    bench.permits = null;
    bench.run(700);
    expect(bench.core.controller.drive_counts).toBe(0);
    expect(bench.status & STATUS.tripped).not.toBe(0);
    expect(bench.session.sample.cause).toBe(2);
    bench.session.reset(3);
    bench.run(50);
    expect(bench.told("reset-refused")[0]?.text).toMatch(/latched cause/);
    bench.session.reset(2);
    bench.run(50);
    expect(bench.told("reset-done")[0]?.value).toBe(2);
    expect(bench.status & STATUS.tripped).toBe(0);
    expect(bench.told("dark-confirmed")).toEqual([]);
  });

  test("dark while the way up is cut is repeated until it gets through", () => {
    const bench = new CoreBench().emitting();
    bench.permits = null;
    bench.up = false;
    bench.session.dark(64);
    bench.run(100);
    expect(bench.core.controller.drive_counts).toBe(1000);
    bench.up = true;
    bench.run(40);
    expect(bench.core.controller.drive_counts).toBe(0);
    bench.run(40);
    expect(bench.told("dark-confirmed").map((f) => f.value)).toEqual([64]);
  });

  test("the core reset under the session: named, introduced anew, tripped, curve after the reset", () => {
    const bench = new CoreBench().emitting();
    bench.permits = null;
    bench.core.controller.boot("watchdog", bench.core.tick);
    bench.run(1500);
    expect(bench.told("board-reset")).toHaveLength(1);
    expect(bench.told("introduced")).toHaveLength(2);
    expect(bench.status & STATUS.tripped).not.toBe(0);
    expect(bench.session.sample.cause).toBe(6);
    expect(bench.session.phase).toBe("loading");
    bench.session.reset(6);
    bench.run(1000);
    expect(bench.session.phase).toBe("ready");
    expect(bench.told("curve-loaded")).toHaveLength(2);
  });

  test("ticks that wrap while it emits are nothing to either side", () => {
    const bench = new CoreBench(0xffffffff - 6000);
    bench.emitting();
    bench.run(3000);
    expect(bench.core.tick).toBeLessThan(20_000);
    expect(bench.status & STATUS.emitting).not.toBe(0);
    expect(bench.told("board-reset")).toEqual([]);
    expect(bench.told("permit-refused")).toEqual([]);
    expect(Math.abs(bench.session.clock.drift)).toBeLessThan(0.001);
  });

  test("the board's own counters agree that nothing was broken on the way", () => {
    const bench = new CoreBench().emitting();
    bench.session.status();
    bench.run(20);
    expect(bench.session.boardCounts).toMatchObject({ crc: 0, long: 0, form: 0, verb: 0, bare: 0 });
    expect(bench.session.counts).toMatchObject({
      crc: 0,
      form: 0,
      verb: 0,
      unexpected: 0,
      lost: 0,
    });
  });
});
