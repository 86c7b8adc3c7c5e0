import { describe, expect, test } from "vitest";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { HAZARD_IDS } from "../../../daemon/model/bench.ts";
import { BARE_DIODE, benchOf, changed, NORTH, problemOf } from "./files.ts";

describe("the files that ship", () => {
  test("north has nothing to mend", () => {
    expect(parseBench(NORTH)).toMatchObject({ ok: true, problems: [] });
  });
  test("north is the bench the design names", () => {
    const { diode, limits, crystal, controller } = benchOf(NORTH);
    expect(diode).toMatchObject({ threshold_mA: 400, slope_mWpermA: 1.05, absolute_mA: 2200 });
    expect((diode.v0_mV ?? 0) + (diode.rs_ohm ?? 0) * 1800).toBeCloseTo(1850, 9);
    expect(limits.current_mA).toBe(1900);
    expect(crystal?.wavelength_nm).toBe(1064);
    expect(controller).toMatchObject({ rate_perS: 50, term_ms: 500, serial: null });
  });
  test("the bare diode has nothing to mend, no crystal, and defaults for what it leaves out", () => {
    expect(parseBench(BARE_DIODE)).toMatchObject({ ok: true, problems: [] });
    const bench = benchOf(BARE_DIODE);
    expect(bench.crystal).toBeNull();
    expect(bench.diode.v0_mV).toBeNull();
    expect(bench.limits.darkTime_ms).toBe(600_000);
    expect(bench.controller.transport).toEqual({
      kind: "serial",
      path: "/dev/ttyUSB0",
      baud: 115_200,
    });
  });
  test("every hazard row has levels, and those that follow from term and dark time do", () => {
    const { hazards } = benchOf(changed(NORTH, "term: 500 ms", "term: 600 ms"));
    expect(Object.keys(hazards)).toEqual([...HAZARD_IDS]);
    expect(hazards["sample-gap"]).toMatchObject({ warn: 150, trip: 600 });
    expect(hazards["dark-time"].trip).toBe(600_000);
  });
  test("a bench is frozen all through", () => {
    const bench = benchOf(NORTH);
    expect(Object.isFrozen(bench.hazards["case-over"])).toBe(true);
    expect(Object.isFrozen(bench.derating[0])).toBe(true);
  });
});

describe("an error stands at its place", () => {
  const lineOf = (text: string, passage: string): number =>
    text.slice(0, text.indexOf(passage)).split("\n").length;

  test("a bare number, with line and column of the number", () => {
    const text = changed(NORTH, "current: 1.9 A", "current: 1.9");
    const line = lineOf(text, "  current: 1.9");
    expect(problemOf(text, "quantity")).toMatchObject({
      level: "error",
      path: "limits.current",
      line,
      column: 12,
      found: "1.9",
    });
  });
  test("an unknown key, with the key that is meant", () => {
    const text = changed(NORTH, "slew-up:", "slew_up:");
    expect(problemOf(text, "unknown-key")).toMatchObject({
      path: "limits.slew_up",
      line: lineOf(text, "slew_up"),
      column: 3,
      do: "did you mean slew-up?",
    });
  });
  test("an unknown key near to nothing", () => {
    const text = changed(NORTH, "slew-up:", "colour:");
    expect(problemOf(text, "unknown-key")?.do).toBe("take it out");
  });
  test("a missing key, at the section that lacks it", () => {
    const text = changed(NORTH, "  absolute: 2.2 A", "  # absolute: 2.2 A");
    expect(problemOf(text, "missing")).toMatchObject({
      path: "diode.absolute",
      line: lineOf(text, "diode:"),
    });
  });
  test("a missing section", () => {
    const text = changed(NORTH, "limits:", "# limits:");
    expect(problemOf(text, "missing")).toMatchObject({ path: "limits", do: "add limits" });
  });
  test("an empty value, at its key", () => {
    const text = changed(NORTH, "current: 1.9 A", "current:");
    expect(problemOf(text, "quantity")).toMatchObject({
      path: "limits.current",
      line: lineOf(text, "  current:"),
      found: "nothing",
    });
  });
  test("a value in a list counts from zero, like the list in the program", () => {
    const text = changed(
      NORTH,
      "{ case: 42 °C, current: 1.54 A }",
      "{ case: 42, current: 1.54 A }",
    );
    expect(problemOf(text, "quantity")?.path).toBe("derating[1].case");
  });
  test("a value outside every sensible range", () => {
    const text = changed(NORTH, "threshold: 0.40 A ", "threshold: 400 A ");
    expect(problemOf(text, "range")).toMatchObject({ path: "diode.threshold", found: "400 A" });
  });
  test("a section that is a line, and a line that is a section", () => {
    const text = changed(NORTH, "title: 808", "title: {a: 1}\nold: 808");
    expect(problemOf(text, "shape")).toMatchObject({ path: "title", found: "a map of keys" });
    const other = "bench: x\ncontroller: none\n";
    expect(problemOf(other, "shape")).toMatchObject({ path: "controller", line: 2 });
  });
  test("a row that follows from elsewhere cannot be written", () => {
    const text = changed(NORTH, "hazards:", "hazards:\n  sample-gap: { trip: 1 s }");
    expect(problemOf(text, "unknown-key")?.path).toBe("hazards.sample-gap");
  });
  test("words that are not in the list", () => {
    const text = changed(NORTH, "light: continuous", "light: pulsed");
    expect(problemOf(text, "light")).toMatchObject({ path: "light", found: "pulsed" });
    const other = changed(NORTH, "place: to-ground", "place: to-grund");
    expect(problemOf(other, "word")?.do).toBe("did you mean to-ground?");
  });
  test("a serial port without its path", () => {
    const text = changed(NORTH, "kind: built-in", "kind: serial");
    expect(problemOf(text, "missing")?.path).toBe("controller.connect.path");
  });
  test("two laws for a channel", () => {
    const text = changed(NORTH, "    ntc:", "    linear: { per-count: 0.1 K }\n    ntc:");
    expect(problemOf(text, "law")).toMatchObject({ path: "channels.case", found: "2 laws" });
  });
  test("an error below zero, which would lift the ceiling, and a scale of zero", () => {
    const text = changed(NORTH, "error: 0.5 K", "error: -0.5 K");
    expect(problemOf(text, "range")).toMatchObject({ path: "channels.case.error" });
    const other = changed(NORTH, "per-count: 0.05 mW", "per-count: 0 mW");
    expect(problemOf(other, "range")?.path).toBe("channels.photodiode.linear.per-count");
  });
  test("a channel in a unit that does not fit", () => {
    const text = changed(NORTH, "error: 0.5 K", "error: 5 mW");
    expect(problemOf(text, "unit")).toMatchObject({ path: "channels.case.error" });
  });
});

test("all errors come at once, in the order of the file", () => {
  let text = changed(NORTH, "term: 500 ms", "term: 500");
  text = changed(text, "slope: 1.05 W/A", "slope: 1.05 W/V");
  text = changed(text, "recover: 1 K", "recover: 1 °C");
  text = changed(text, "key: yes", "key: maybe");
  const { ok, problems } = parseBench(text);
  expect(ok).toBe(false);
  expect(problems.map((problem) => problem.path)).toEqual([
    "controller.term",
    "diode.slope",
    "limits.recover",
    "protections.key",
  ]);
});

test("a fact row is switched by a word, a level by none", () => {
  const text = changed(
    NORTH,
    "hazards:",
    "hazards:\n  key: { trip: none }\n  dark-light: { warn: none, trip: 6 % }",
  );
  const { hazards } = benchOf(text);
  expect(hazards.key.trip).toBeNull();
  expect(hazards["dark-light"]).toMatchObject({ warn: null, trip: 0.06, tripDelay_ms: 500 });
});
