import { describe, expect, test } from "vitest";
import { consequences, differences } from "../../../daemon/bench-file/describe.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { PROBLEMS_TOLD_MAX, problemLines } from "../../../daemon/bench-file/report.ts";
import { BARE_DIODE, benchOf, changed, NORTH } from "./files.ts";

const north = benchOf(NORTH);
const plain = (sentences: readonly string[]): string[] =>
  sentences.map((sentence) => sentence.replaceAll("\u00a0", " "));
const change = (from: string, to: string): string[] =>
  plain(differences(north, benchOf(changed(NORTH, from, to))));

describe("differences in words", () => {
  test("the same bench has none, however it is written", () => {
    expect(differences(north, benchOf(NORTH))).toEqual([]);
    expect(change("current: 1.9 A", "current: 1900 mA")).toEqual([]);
    expect(change("# The built-in bench", "# Our bench")).toEqual([]);
  });
  test.each([
    ["current: 1.9 A", "current: 1.8 A", "limits.current goes from 1.90 A to 1.80 A."],
    ["current: 1.9 A", "current: 1.9001 A", "limits.current goes from 1.90 A to 1.9001 A."],
    [
      "trip: 50 °C",
      "trip: 48 °C",
      "hazards.case-over.trip goes from 50.0 °C after 300 ms to 48.0 °C after 300 ms.",
    ],
    ["trip: 50 %", "trip: none", "hazards.output-low.trip goes from 50 % after 1 s to none."],
    ["key: yes", "key: no", "protections.key goes from yes to no."],
    ["board: any", "board: N-1", "controller.board goes from any to N-1."],
    [
      "beta: 3950 K",
      "beta: 3951 K",
      /^channels\.case goes from ntc with .*3950.* to ntc with .*3951/,
    ],
    [
      "case: 42 °C, current: 1.54 A",
      "case: 42 °C, current: 1.5 A",
      /^derating goes from .*1\.54 A at 42\.0 °C.* to .*1\.50 A at 42\.0 °C/,
    ],
    ["  junction-max: 80 °C", "", "diode.junction-max is gone; it was 80.0 °C."],
  ])("%s to %s", (from, to, sentence) => {
    const [only, ...more] = change(from, to);
    expect(more).toEqual([]);
    if (typeof sentence === "string") expect(only).toBe(sentence);
    else expect(only).toMatch(sentence);
  });
  test("every part of a bench is compared", () => {
    const places = differences(north, benchOf(BARE_DIODE)).map((line) => line.split(".")[0] ?? "");
    for (const part of [
      "bench goes",
      "title goes",
      "controller",
      "diode",
      "crystal",
      "cooling",
      "limits",
      "derating goes",
      "channels",
      "hazards",
    ]) {
      expect(places.some((place) => place.startsWith(part))).toBe(true);
    }
  });
});

test("consequences name the wire's shares and each row's slowest rate", () => {
  const [wire, ...rows] = plain(consequences(benchOf(BARE_DIODE)));
  expect(wire).toBe(
    "The wire: samples and permits fill at most 48 % of the line upward, 8 % downward.",
  );
  expect(rows).toContain(
    "over-ceiling: trips at 101 % after 30 ms; dark within 250 ms with 18.2 /s or more.",
  );
  expect(rows).toContain("key: trips at once; dark within 250 ms with 7.1 /s or more.");
  expect(consequences(north)[0]).toMatch(/^Each row/);
});

test("consequences tell what a divider does to its sensor: 0.625 mW at 1.5 mW/K", () => {
  const text = changed(
    NORTH,
    "full: 16384 counts",
    "full: 16384 counts\n      supply: 5 V\n      dissipation: 1.5 mW/K\n     ",
  );
  const [sensor] = plain(consequences(benchOf(text)));
  expect(sensor).toBe("The sensor of case: its divider warms it by up to 0.42 K.");
});

describe("problems as lines", () => {
  test("two lines a problem, with the place a terminal can open", () => {
    const text = changed(NORTH, "current: 1.9 A", "current: 2.6 A");
    const line = text.slice(0, text.indexOf("current: 2.6 A")).split("\n").length;
    expect(plain(problemLines(parseBench(text).problems, "north.yaml"))).toEqual([
      `north.yaml:${line}:12  error  limits.current  found 2.60 A; wanted at most the diode's absolute maximum of 2.20 A`,
      "    write 2.20 A or less",
    ]);
  });
  test("a torn file is not told without end", () => {
    const many = Array.from({ length: 300 }, (_, n) => `k${n}: x`).join("\n");
    const lines = problemLines(parseBench(many).problems, "f");
    expect(lines.length).toBe(2 * PROBLEMS_TOLD_MAX + 1);
    expect(lines[lines.length - 1]).toMatch(/and \d+ more/);
  });
});
