import { describe, expect, test } from "vitest";
import { consequences, differences } from "../../../daemon/bench-file/describe.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { benchWith, STREAM, textWith } from "../loop/watched.ts";

const codes = (controller: string, rest?: string): string[] => {
  const parsed = parseBench(textWith(controller, rest));
  const errors = parsed.problems.filter(({ level }) => level === "error");
  for (const problem of errors) {
    expect(problem.line).toBeGreaterThan(0);
    expect(problem.do).not.toBe("");
  }
  return errors.map(({ code, path }) => `${code} ${path}`);
};
const column = (text: string): string => `
  stream:
    format: key-value
    columns: { case: { from: T, unit: °C }, ${text} }`;
const cut = (text: string): string => `${STREAM}\n  cut-off: { ${text} }`;

describe("the stream of a bench file", () => {
  test("printed units become the held ones, with scale and offset", () => {
    const { controller, conversions } = benchWith(
      column("current: { from: I, unit: A, scale: 2, offset: 0.1, step: 0.01, error: 0.02 }"),
    );
    const { columns } = controller.stream ?? { columns: [] };
    expect(columns.find(({ channel }) => channel === "current")).toMatchObject({
      unit: "mA",
      step: 0.01,
      perCount: 20,
    });
    // Printed 0.50 is 50 counts: 2 x 0.50 A + 0.1 A.
    expect(conversions.current).toEqual({
      version: 1,
      law: { kind: "linear", perCount: 20, offset: 100 },
      error: 40,
    });
  });

  test("a voltage over a shunt is a current, one behind a photodiode's resistor a power", () => {
    const bench = benchWith(
      column(
        "current: { from: V1, unit: mV, shunt: 100 mohm }, photodiode: { from: V2, unit: V, feedback: 10 kohm, responsivity: 0.5 }",
      ),
    );
    const perPrinted = (name: string): number => {
      const found = bench.controller.stream?.columns.find(({ channel }) => channel === name);
      return (found?.perCount ?? 0) / (found?.step ?? 1);
    };
    // 1 mV over 0.1 ohm is 10 mA; 1 V over 10 kohm is 0.1 mA, which 0.2 mW makes at 0.5 A/W.
    expect(perPrinted("current")).toBeCloseTo(10, 9);
    expect(perPrinted("photodiode")).toBeCloseTo(0.2, 9);
  });

  test("raw counts take the sensor's law from channels, and its span as their range", () => {
    const ntc = `
channels: { case: { error: 1 K, ntc: { r25: 10 kohm, beta: 3950 K, fixed: 10 kohm, full: 1024 counts } } }
diode: { wavelength: 808 nm, threshold: 0.40 A, slope: 1.05 W/A, threshold-t0: 120 K, slope-t1: 350 K, absolute: 2.2 A }
limits: { current: 1.9 A }
derating: [{ case: 28 °C, current: 2.10 A }, { case: 60 °C, current: 1.60 A }]
`;
    const raw = "\n  stream: { format: csv, columns: { case: { from: 1, unit: counts } } }";
    const bench = benchWith(raw, ntc);
    expect(bench.controller.stream?.columns[0]).toMatchObject({ count_min: 0, count_max: 1024 });
    expect(bench.conversions.case?.law.kind).toBe("ntc");
  });

  test("a slow stream has a term that outlives its own pauses", () => {
    expect(benchWith(STREAM.replace("10 /s", "1 /s")).controller.term_ms).toBe(5000);
  });

  test.each([
    ["current: { from: I, unit: Amp }", "unit controller.stream.columns.current.unit"],
    ["current: { from: I, unit: °C }", "unit controller.stream.columns.current.unit"],
    ["photodiode: { from: P, unit: V }", "unit controller.stream.columns.photodiode.unit"],
    ["current: { from: I, unit: counts }", "unit controller.stream.columns.current.unit"],
    ["current: { from: I, unit: A, scale: 0 }", "range controller.stream.columns.current.scale"],
    ["current: { from: I, unit: A, shunt: 1 ohm }", "law controller.stream.columns.current.unit"],
    [
      "photodiode: { from: P, unit: V, feedback: 1 kohm }",
      "law controller.stream.columns.photodiode.unit",
    ],
  ])("refuses %s", (text, code) => {
    expect(codes(column(text))).toContain(code);
  });

  test("refuses a stream of which nothing is judged, and places that are none", () => {
    const nothing = "\n  stream: { format: json, columns: { fan: { from: f, unit: counts } } }";
    expect(codes(nothing)).toEqual(["nothing-judged controller.stream.columns"]);
    const place = "\n  stream: { format: csv, columns: { case: { from: T, unit: °C } } }";
    expect(codes(place)).toEqual(["place controller.stream.columns.case.from"]);
    const comma =
      "\n  stream: { format: csv, decimals: comma, columns: { case: { from: 1, unit: °C } } }";
    expect(codes(comma)).toEqual(["separator controller.stream.separator"]);
  });
});

describe("a cut-off", () => {
  test("a static line is taken only where asserted means cut", () => {
    expect(codes(cut("kind: rts, asserted-means: light"))).toEqual([
      "cut-off controller.cut-off.asserted-means",
    ]);
    expect(codes(cut("kind: rts"))).toEqual([]);
    expect(codes(cut("kind: dtr, mode: toggled, asserted-means: light"))).toEqual([]);
  });

  test("a text needs its answer; a toggled line needs what it is decided on", () => {
    expect(codes(cut("kind: text, send: OFF"))).toEqual(["cut-off controller.cut-off.expect"]);
    const blind = `${column("fan: { from: f, unit: counts }")}\n  cut-off: { kind: rts, mode: toggled }`;
    expect(codes(blind)).toEqual(["cut-off controller.cut-off.mode"]);
  });

  test("belongs to a stream alone, and a line to a serial port", () => {
    expect(codes("\n  cut-off: { kind: rts }")).toEqual(["cut-off controller.cut-off"]);
  });
});

test("check says what is enforced, and a changed stream is a difference", () => {
  const only = consequences(benchWith(STREAM));
  expect(only[0]).toContain("Watched, not enforced");
  expect(only.join(" ")).not.toContain("dark within");
  const cutting = consequences(benchWith(cut("kind: rts")));
  expect(cutting[0]).toContain("cuts on command, but not if this computer hangs");
  expect(differences(benchWith(STREAM), benchWith(cut("kind: rts")))[0]).toMatch(
    /^controller\.cut-off is new/,
  );
  expect(
    differences(benchWith(STREAM), benchWith(STREAM.replace("from: I", "from: J")))[0],
  ).toMatch(/^controller\.stream\.columns\.current goes from I/);
});
