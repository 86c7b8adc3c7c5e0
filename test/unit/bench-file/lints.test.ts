import { describe, expect, test } from "vitest";
import { LINTS } from "../../../daemon/bench-file/lints/catalogue.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { BARE_DIODE, changed, NORTH } from "./files.ts";

/** One lint: a change that makes it speak, and a near one that does not. */
interface Case {
  readonly code: string;
  readonly level: "error" | "warning";
  readonly path: string;
  readonly file: string;
  readonly fires: readonly [from: string, to: string];
  readonly quiet: readonly [from: string, to: string];
}
const lint = (
  level: Case["level"],
  code: string,
  path: string,
  from: string,
  fires: string,
  quiet: string,
  file = NORTH,
): Case => ({ code, level, path, file, fires: [from, fires], quiet: [from, quiet] });

const NTC =
  "ntc: { r25: 10 kohm, beta: 3950 K, fixed: 10 kohm, place: to-ground, full: 16384 counts }";
const steinhart = (a: string, b: string, c: string): string =>
  `steinhart-hart: { a: ${a}, b: ${b}, c: ${c}, fixed: 10 kohm, full: 16384 counts }`;
const platinum = (fixed: string, full: number): string =>
  `platinum: { r0: 100 ohm, fixed: ${fixed}, full: ${full} counts }`;

const CASES: readonly Case[] = [
  lint(
    "error",
    "derating-rises",
    "derating[1].current",
    "case: 42 °C, current: 1.54 A",
    "case: 42 °C, current: 2.15 A",
    "case: 42 °C, current: 2.10 A",
  ),
  lint(
    "error",
    "derating-order",
    "derating[1].case",
    "case: 42 °C, current: 1.54 A",
    "case: 28 °C, current: 1.54 A",
    "case: 29 °C, current: 1.54 A",
  ),
  lint(
    "error",
    "over-absolute",
    "limits.current",
    "current: 1.9 A",
    "current: 2.3 A",
    "current: 2.2 A",
  ),
  lint(
    "error",
    "over-absolute",
    "derating[0].current",
    "case: 28 °C, current: 2.10 A",
    "case: 28 °C, current: 2.21 A",
    "case: 28 °C, current: 2.20 A",
  ),
  lint(
    "warning",
    "no-room-for-clamp",
    "limits.current",
    "current: 1.9 A",
    "current: 2.1 A",
    "current: 2.0 A",
  ),
  lint(
    "error",
    "under-threshold",
    "derating[0].current",
    "current: 1.9 A",
    "current: 400 mA",
    "current: 1.2 A",
  ),
  lint(
    "warning",
    "under-threshold",
    "derating[2].current",
    "current: 0.80 A",
    "current: 0.45 A",
    "current: 0.55 A",
  ),
  lint(
    "error",
    "crystal-dark",
    "crystal.threshold",
    "threshold: 330 mW",
    "threshold: 1.8 W",
    "threshold: 600 mW",
  ),
  lint(
    "warning",
    "junction-first",
    "derating[0].current",
    "junction-max: 80 °C",
    "junction-max: 55 °C",
    "junction-max: 78 °C",
  ),
  lint(
    "warning",
    "hunts",
    "derating[2].current",
    "sink-to-room: 4.5 K/W",
    "sink-to-room: 20 K/W",
    "sink-to-room: 6 K/W",
  ),
  lint(
    "warning",
    "beyond-quantum",
    "diode.slope",
    "slope: 1.05 W/A",
    "slope: 1.6 W/A",
    "slope: 1.4 W/A",
  ),
  lint("warning", "beyond-quantum", "crystal.slope", "slope: 45 %", "slope: 80 %", "slope: 70 %"),
  lint(
    "warning",
    "efficiency",
    "diode.slope",
    "voltage: 1.49 V",
    "voltage: 14.9 V",
    "voltage: 1.6 V",
  ),
  lint("error", "term-short", "controller.term", "rate: 50 /s", "rate: 9 /s", "rate: 20 /s"),
  lint("warning", "term-tight", "controller.term", "term: 500 ms", "term: 250 ms", "term: 300 ms"),
  lint(
    "error",
    "wire-up",
    "controller.rate",
    "rate: 50 /s",
    "rate: 100 /s",
    "rate: 60 /s",
    BARE_DIODE,
  ),
  lint(
    "error",
    "wire-down",
    "controller.connect.baud",
    "baud: 115200 baud",
    "baud: 19200 baud",
    "baud: 100000 baud",
    BARE_DIODE,
  ),
  lint(
    "error",
    "warn-beyond-trip",
    "hazards.case-over.warn",
    "warn: 42 °C",
    "warn: 50 °C",
    "warn: 49 °C",
  ),
  lint(
    "error",
    "warn-beyond-trip",
    "hazards.output-low.warn",
    "warn: 90 %",
    "warn: 50 %",
    "warn: 51 %",
  ),
  lint("error", "rate-slow", "controller.rate", "rate: 50 /s", "rate: 15 /s", "rate: 20 /s"),
  lint(
    "error",
    "too-late",
    "hazards.case-over.trip-after",
    "trip-after: 300 ms",
    "trip-after: 900 ms",
    "trip-after: 500 ms",
  ),
  lint("warning", "row-off", "hazards.case-over.trip", "trip: 50 °C", "trip: none", "trip: 49 °C"),
  lint(
    "error",
    "case-trip-high",
    "hazards.case-over.trip",
    "trip: 50 °C",
    "trip: 80 °C",
    "trip: 60 °C",
  ),
  lint(
    "error",
    "sensor-span",
    "channels.case.platinum.fixed",
    NTC,
    platinum("10 kohm", 16384),
    platinum("1 kohm", 16384),
    BARE_DIODE,
  ),
  lint(
    "warning",
    "sensor-coarse",
    "channels.case.platinum.fixed",
    NTC,
    platinum("1 kohm", 1024),
    platinum("1 kohm", 65536),
    BARE_DIODE,
  ),
  lint(
    "warning",
    "thermistor",
    "channels.case.ntc.beta",
    "beta: 3950 K",
    "beta: 1000 K",
    "beta: 3435 K",
    BARE_DIODE,
  ),
  lint(
    "error",
    "thermistor",
    "channels.case.steinhart-hart",
    NTC,
    steinhart("1.129e-2", "2.341e-4", "8.767e-8"),
    steinhart("1.129e-3", "2.341e-4", "8.767e-8"),
    BARE_DIODE,
  ),
  lint(
    "warning",
    "unseen",
    "channels",
    "  photodiode:\n    error: 20 mW",
    "  spare:\n    error: 20 mW",
    "  photodiode:\n    error: 10 mW",
    BARE_DIODE,
  ),
  lint(
    "warning",
    "self-heating",
    "channels.case.error",
    "full: 16384 counts }",
    "full: 16384 counts, supply: 5 V, dissipation: 0.5 mW/K }",
    "full: 16384 counts, supply: 5 V, dissipation: 0.7 mW/K }",
    BARE_DIODE,
  ),
  ...[
    "key",
    "interlock-loop",
    "emission-warning",
    "beam-stop",
    "manual-reset",
    "toggled-enable",
  ].map((key) =>
    lint("warning", `no-${key}`, `protections.${key}`, `${key}: yes`, `${key}: no`, `${key}: true`),
  ),
  lint("error", "light", "light", "light: continuous", "light: pulsed", "light: continuous"),
  lint(
    "error",
    "efficiency-impossible",
    "diode.slope",
    "voltage: 1.49 V",
    "voltage: 0.4 V",
    "voltage: 0.6 V",
  ),
  lint(
    "warning",
    "voltage-under-photon",
    "diode.voltage",
    "voltage: 1.49 V",
    "voltage: 1.0 V",
    "voltage: 1.2 V",
  ),
  lint(
    "warning",
    "t1-under-t0",
    "diode.slope-t1",
    "slope-t1: 350 K",
    "slope-t1: 119 K",
    "slope-t1: 120 K",
  ),
  lint("warning", "reference-far", "diode.at", "at: 25 °C", "at: -13 °C", "at: -12 °C"),
  lint(
    "error",
    "crystal-upconverts",
    "crystal.wavelength",
    "wavelength: 1064 nm",
    "wavelength: 532 nm",
    "wavelength: 914 nm",
  ),
  lint(
    "warning",
    "pump-off-line",
    "crystal.line",
    "line: 808.5 nm",
    "line: 825 nm",
    "line: 809 nm",
  ),
  lint(
    "warning",
    "limit-idle",
    "limits.current",
    "case: 28 °C, current: 2.10 A",
    "case: 28 °C, current: 1.80 A",
    "case: 28 °C, current: 1.90 A",
  ),
  lint(
    "warning",
    "derating-ends-early",
    "derating[2].case",
    "{ case: 50 °C, current",
    "{ case: 49 °C, current",
    "{ case: 51 °C, current",
  ),
  lint(
    "warning",
    "cooling-weak",
    "cooling.sink-to-room",
    "sink-to-room: 4.5 K/W",
    "sink-to-room: 20 K/W",
    "sink-to-room: 8 K/W",
  ),
  lint(
    "warning",
    "slew-fast",
    "limits.slew-up",
    "slew-up: 200 mA/s",
    "slew-up: 40 A/s",
    "slew-up: 20 A/s",
  ),
  lint("warning", "warn-off", "hazards.case-over.warn", "warn: 42 °C", "warn: none", "warn: 43 °C"),
  lint(
    "warning",
    "recover-small",
    "limits.recover",
    "recover: 1 K ",
    "recover: 0.4 K ",
    "recover: 0.5 K ",
  ),
  lint(
    "warning",
    "deadband-small",
    "hazards.case-over.deadband",
    "full: 16384 counts  #",
    "full: 32 counts  #",
    "full: 128 counts  #",
  ),
  lint(
    "warning",
    "error-large",
    "channels.case.error",
    "error: 0.5 K ",
    "error: 9 K ",
    "error: 8 K ",
  ),
  lint(
    "warning",
    "sensor-span-cold",
    "channels.case.ntc.fixed",
    "{ case: 25 °C, current: 1.8 A }",
    "{ case: -60 °C, current: 1.8 A }",
    "{ case: -10 °C, current: 1.8 A }",
    BARE_DIODE,
  ),
  lint(
    "warning",
    "steps-coarse",
    "channels.photodiode.linear.per-count",
    "per-count: 0.1 mW",
    "per-count: 80 mW",
    "per-count: 40 mW",
    BARE_DIODE,
  ),
  lint(
    "warning",
    "steps-coarse",
    "channels.current.linear.per-count",
    "channels:\n",
    "channels:\n  current: { error: 5 mA, linear: { per-count: 8 mA } }\n",
    "channels:\n  current: { error: 5 mA, linear: { per-count: 7 mA } }\n",
    BARE_DIODE,
  ),
  lint(
    "warning",
    "output-error",
    "channels.photodiode.error",
    "error: 20 mW",
    "error: 120 mW",
    "error: 100 mW",
    BARE_DIODE,
  ),
];

/** Lints that need more than a file: their pairs stand in a test of their own below. */
const ELSEWHERE = ["term-age"];

test("every lint has a file that makes it speak and one that does not", () => {
  const paired = new Set([...CASES.map(({ code }) => code), ...ELSEWHERE]);
  expect(Object.keys(LINTS).filter((code) => !paired.has(code))).toEqual([]);
  expect(Object.keys(LINTS).length).toBeGreaterThanOrEqual(30);
});

test("every lint says what, why, what to do, and where it comes from", () => {
  for (const [code, text] of Object.entries(LINTS)) {
    for (const words of [text.what, text.why, text.do, text.source]) {
      expect(words.length, code).toBeGreaterThan(10);
      expect(words, code).not.toMatch(/[.!]$/);
    }
  }
});

test("term-age counts five permits and the worst age measured: 300 ms and 201 ms are over 500 ms", () => {
  const codes = (permitAge_ms: number | null) =>
    parseBench(NORTH, { permitAge_ms }).problems.map(({ code }) => code);
  expect(codes(201)).toContain("term-age");
  expect(codes(200)).not.toContain("term-age");
  expect(codes(null)).not.toContain("term-age");
});

describe.each(CASES.map((one) => [`${one.code} at ${one.path}`, one] as const))("%s", (_n, one) => {
  const spoken = (change: readonly [string, string]) =>
    parseBench(changed(one.file, change[0], change[1])).problems.filter(
      (problem) => problem.code === one.code && problem.path === one.path,
    );
  test(`speaks at "${one.fires[1]}"`, () => {
    const [problem] = spoken(one.fires);
    expect(problem).toMatchObject({ level: one.level });
    expect(problem?.line).toBeGreaterThan(1);
  });
  test(`is quiet at "${one.quiet[1]}"`, () => expect(spoken(one.quiet)).toEqual([]));
});
