import { readdirSync, readFileSync } from "node:fs";
import { describe, expect, test } from "vitest";
import { parseBench } from "../../../../daemon/bench-file/parse.ts";
import { type Guess, guessStream } from "../../../../daemon/link/plain/guess.ts";
import { pieceOf } from "../../../../daemon/link/plain/piece.ts";
import { PlainSession } from "../../../../daemon/link/plain/session.ts";
import type { Bench } from "../../../../daemon/model/bench.ts";
import { mono } from "../../../../daemon/model/times.ts";

/**
 * Streams of our own making, as boards print them: good, ragged, resetting, with banners, half
 * lines, decimal commas and wrong units. Each says what it is to be taken for, or that nobody can say.
 */
interface Stream {
  readonly name: string;
  readonly what: string;
  readonly period_ms: number;
  readonly expect: {
    readonly format: string | null;
    readonly undecided: number;
    readonly time: readonly [string, string] | null;
    readonly columns: Readonly<Record<string, string>>;
  };
  readonly lines: readonly string[];
}

const folder = new URL("./streams/", import.meta.url);
const streams: Stream[] = readdirSync(folder)
  .filter((name) => name.endsWith(".txt"))
  .sort()
  .map((name) => {
    const lines = readFileSync(new URL(name, folder), "latin1").split("\n");
    const after = (n: number, key: string): string => (lines[n] ?? "").slice(key.length);
    return {
      name,
      what: after(0, "# "),
      period_ms: Number(after(1, "# period_ms ")),
      expect: JSON.parse(after(2, "# expect ")),
      lines: lines.slice(3, -1),
    };
  });

const guessOf = ({ lines, period_ms }: Stream): Guess =>
  guessStream(lines.map((line, i) => ({ line, at_ms: i * period_ms })));

const serial = { kind: "serial", path: "/dev/ttyUSB0", baud: 9600 } as const;
const REST = `
diode: { wavelength: 808 nm, threshold: 0.40 A, slope: 1.05 W/A, threshold-t0: 120 K, slope-t1: 350 K, absolute: 2.2 A }
limits: { current: 1.9 A }
derating:
  - { case: 28 °C, current: 2.10 A }
  - { case: 60 °C, current: 1.60 A }
hazards: { case-over: { warn: 40 °C, trip: 50 °C } }
`;

const benchOf = (guess: Guess): Bench => {
  const parsed = parseBench(`bench: attic\n${pieceOf(guess, serial)}${REST}`);
  if (!parsed.ok) throw new Error(JSON.stringify(parsed.problems, null, 1));
  return parsed.bench;
};

test("there are thirty streams or more", () => {
  expect(streams.length).toBeGreaterThanOrEqual(30);
});

describe.each(streams.map((stream) => [`${stream.name}: ${stream.what}`, stream] as const))(
  "%s",
  (_title, stream) => {
    const guess = guessOf(stream);

    test("is taken for what it is, or honestly not decided", () => {
      const columns = Object.fromEntries(
        guess.columns.map((c) => [c.name, `${c.channel} ${c.unit}`]),
      );
      expect(guess.format).toBe(stream.expect.format);
      expect(columns).toEqual(stream.expect.columns);
      const { time } = guess;
      expect(time === null ? null : [time.from, time.unit]).toEqual(stream.expect.time);
      expect(guess.undecided).toHaveLength(stream.expect.undecided);
    });

    // A stream whose current nobody can tell has no proposal that could be run.
    if (!guess.columns.some(({ channel }) => channel === "current")) return;
    test("its proposal loads as a bench file and reads its lines", () => {
      const bench = benchOf(guess);
      const { stream: spec } = bench.controller;
      if (spec === undefined) throw new Error("no stream");
      const session = new PlainSession({ stream: spec, rate_perS: 10, dark_counts: 0 });
      session.connected(mono(0));
      const current: number[] = [];
      const case_degC: number[] = [];
      const at = (name: string): number => spec.columns.findIndex((c) => c.channel === name);
      for (const [i, line] of stream.lines.entries()) {
        session.feed(line, mono((i + 1) * stream.period_ms));
        for (let item = session.take(); item !== null; item = session.take()) {
          if (item.kind !== "sample") continue;
          const value = (name: string): number => {
            const law = bench.conversions[name]?.law;
            const count = item.sample.values[at(name)] ?? Number.NaN;
            return law?.kind === "linear" ? count * law.perCount + law.offset : Number.NaN;
          };
          current.push(value("current"));
          if (at("case") >= 0 && value("case") > -99) case_degC.push(value("case"));
        }
      }
      const lines = stream.lines.length;
      expect(current.length).toBeGreaterThan(lines * 0.4);
      // All of these streams were made at 1.52 A and from 31.4 °C on.
      for (const mA of current) expect(Math.abs(mA - 1520)).toBeLessThan(20);
      for (const degC of case_degC) expect(Math.abs(degC - 32.5)).toBeLessThan(2.5);
    });
  },
);
