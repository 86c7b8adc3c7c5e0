import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { guessStream } from "../../../../daemon/link/plain/guess.ts";
import { PlainSession } from "../../../../daemon/link/plain/session.ts";
import type { LinkItem } from "../../../../daemon/link/queue.ts";
import type { StreamSpec } from "../../../../daemon/model/stream.ts";
import { mono } from "../../../../daemon/model/times.ts";

const SEED = 20_261_201;
const column = (channel: string, from: string, step = 0.001): StreamSpec["columns"][number] => ({
  channel,
  from,
  unit: channel === "case" ? "degC" : "mA",
  step,
  perCount: step,
  count_min: -1_000_000,
  count_max: 1_000_000,
});
const KEYED: StreamSpec = {
  format: "key-value",
  separator: "comma",
  decimals: "point",
  time: null,
  banner: "",
  columns: [column("current", "I"), column("case", "T")],
  cutOff: null,
};
const CSV: StreamSpec = {
  ...KEYED,
  format: "csv",
  time: { from: "1", unit_ms: 1 },
  columns: [column("current", "2"), column("case", "3")],
};

class Rig {
  readonly session: PlainSession;
  readonly facts: string[] = [];
  readonly samples: { seq: number; tick: number; values: number[] }[] = [];
  readonly sent: string[] = [];
  now = 0;

  constructor(stream: StreamSpec) {
    this.session = new PlainSession({ stream, rate_perS: 10, dark_counts: 5 });
    this.session.connected(mono(0));
    this.take();
    this.say("torn");
  }

  say(...lines: string[]): this {
    for (const line of lines) {
      this.now += 100;
      this.session.feed(line, mono(this.now));
      this.take();
    }
    return this;
  }

  take(): void {
    for (let item = this.session.take(); item !== null; item = this.session.take()) this.took(item);
  }

  private took(item: LinkItem): void {
    if (item.kind === "fact") this.facts.push(item.fact);
    else if (item.kind === "send") this.sent.push(item.line);
    else {
      const { seq, tick, values } = item.sample;
      this.samples.push({ seq, tick, values: [values[0] ?? 0, values[1] ?? 0] });
    }
  }
}

describe("a stream of plain numbers", () => {
  test("the first line of an opened port is never read: it may be torn", () => {
    const rig = new Rig(KEYED);
    rig.session.disconnected(mono(0), "pulled");
    rig.session.connected(mono(0));
    rig.say("I=1.52 T=31.4");
    expect(rig.samples).toEqual([]);
    rig.say("I=1.52 T=31.4");
    expect(rig.samples.map((s) => s.values)).toEqual([[1520, 31_400]]);
  });

  test("every line is counted by kind; only whole ones become samples", () => {
    const rig = new Rig(KEYED);
    rig.say("boot v1", "I=1.5", "I=1.52 T=31.4", "I=1.5I=1.52 T=31.4", "I=\u0001\u0002", "T=3 T=4");
    rig.say("I=1 T=2");
    expect(rig.session.kinds).toEqual({ values: 2, some: 2, text: 1, half: 0, broken: 2 });
    expect(rig.samples.map((s) => s.values)).toEqual([
      [1520, 31_400],
      [1000, 2000],
    ]);
  });

  test("values that come one a line are gathered, and none is taken twice", () => {
    const rig = new Rig(KEYED).say("I=1", "T=20", "I=2", "I=3", "T=21");
    expect(rig.samples.map((s) => s.values)).toEqual([
      [1000, 20_000],
      [3000, 21_000],
    ]);
  });

  test("no reading, and one beyond all reason, lie just outside the range", () => {
    const rig = new Rig(KEYED).say("I=nan T=20", "I=1 T=1e9", "I=-1e9 T=OPEN");
    expect(rig.samples.map((s) => s.values)).toEqual([
      [-1_000_001, 20_000],
      [1000, 1_000_001],
      [-1_000_001, -1_000_001],
    ]);
  });

  test("its own time counts, and going back is a restart", () => {
    const rig = new Rig(CSV).say("ms,I,T", "5000,1,20", "5100,1,20", "5100,1,20", "12,1,20");
    expect(rig.samples.map((s) => s.tick)).toEqual([5000, 5100, 5101, 12]);
    expect(rig.facts).toEqual(["port-open", "introduced", "board-reset", "introduced"]);
    expect(rig.session.counts.resets).toBe(1);
  });

  test("a csv line with fewer cells is a half one, one with words is text", () => {
    const rig = new Rig(CSV).say("5000,1.52", "debug 7", "5100,1,x", "5200,1,20");
    expect(rig.session.kinds).toMatchObject({ half: 1, text: 1, broken: 1, values: 1 });
  });

  test("a watched controller without a cut-off is never sent anything", () => {
    const rig = new Rig(KEYED).say("I=1 T=20");
    rig.session.dark(64);
    rig.session.permit(1);
    rig.session.reset(64);
    rig.session.arm();
    rig.say("I=1 T=20");
    expect(rig.sent).toEqual([]);
    expect(rig.session.takeLevel()).toBeNull();
  });
});

const number = fc.double({ min: -900, max: 900, noNaN: true }).map((x) => x.toFixed(3));
const rubbish = fc.oneof(
  fc.string({ maxLength: 60 }),
  fc.uint8Array({ maxLength: 60 }).map((bytes) => String.fromCharCode(...bytes)),
  fc.constantFrom("I=", "T=", "{", '{"I":', ",,,", "I=1,5", "I=1.2.3 T=4", "I=--1 T=+"),
);

describe(`whatever comes (seed ${SEED})`, () => {
  const runs = { seed: SEED, numRuns: 300 };

  test("good lines among rubbish bring what they say, and nothing throws", () => {
    const good = fc.tuple(number, number).map(([i, t]) => ({ i, t, line: `I=${i} T=${t}` }));
    fc.assert(
      fc.property(fc.array(fc.oneof(good, rubbish), { maxLength: 40 }), (items) => {
        const rig = new Rig(KEYED);
        const wanted: number[][] = [];
        for (const item of items) {
          if (typeof item === "string") {
            // A key among rubbish may be a reading: only what surely holds none is said here.
            rig.say(item.replaceAll(/[IT]/g, "x"));
          } else {
            rig.say(item.line);
            wanted.push([item.i, item.t].map((text) => Math.round(Number(text) * 1000) + 0));
          }
        }
        expect(rig.samples.map((s) => s.values)).toEqual(wanted);
        const total = Object.values(rig.session.kinds).reduce((a, b) => a + b, 0);
        expect(total).toBe(items.length);
      }),
      runs,
    );
  });

  test("no line of any kind makes the session or the guess throw, or is lost from the counts", () => {
    fc.assert(
      fc.property(fc.array(rubbish, { maxLength: 40 }), (lines) => {
        for (const spec of [
          KEYED,
          CSV,
          { ...KEYED, format: "json" },
          { ...KEYED, format: "labelled" },
        ]) {
          const rig = new Rig(spec as StreamSpec).say(...lines);
          const total = Object.values(rig.session.kinds).reduce((a, b) => a + b, 0);
          expect(total).toBeGreaterThanOrEqual(lines.length);
        }
        const guess = guessStream(lines.map((line, i) => ({ line, at_ms: i * 100 })));
        if (guess.format === null) expect(guess.undecided).not.toEqual([]);
      }),
      runs,
    );
  });

  test("numbers and ticks always go on, so that no sample is taken for an old one", () => {
    const steps = fc.array(fc.integer({ min: -3000, max: 3000 }), { maxLength: 40 });
    fc.assert(
      fc.property(steps, (by) => {
        const rig = new Rig(CSV);
        let ms = 100_000;
        for (const step of by) {
          ms += step;
          rig.say(`${ms},1,20`);
        }
        for (let i = 1; i < rig.samples.length; i++) {
          const [a, b] = [rig.samples[i - 1], rig.samples[i]];
          expect((b?.seq ?? 0) - (a?.seq ?? 0)).toBe(1);
          const reset = (by[i] ?? 0) < -1000;
          if (!reset) expect((b?.tick ?? 0) - (a?.tick ?? 0)).toBeGreaterThan(0);
        }
      }),
      runs,
    );
  });
});
