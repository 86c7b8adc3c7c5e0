import { expect, test } from "vitest";
import { explain, explained } from "../../../daemon/bench-file/explain.ts";
import { HAZARD_IDS } from "../../../daemon/model/bench.ts";
import { benchOf, changed, NORTH } from "./files.ts";

const plain = (lines: readonly string[] | null): string =>
  (lines ?? []).join("\n").replaceAll("\u00a0", " ");

test("every code and every row is explained in whole sentences", () => {
  for (const word of explained()) {
    const { lines } = explain(word, null);
    expect(lines?.length, word).toBeGreaterThan(0);
    for (const line of lines ?? []) expect(line, word).toMatch(/\.$/);
  }
  expect(explained()).toEqual(expect.arrayContaining([...HAZARD_IDS]));
});

test("a row tells defaults, source, detection, safety time and the slowest rate", () => {
  const text = plain(explain("case-over", null).lines);
  expect(text).toContain("warns at 42.0 °C after 5 s; it trips at 50.0 °C after 300 ms");
  expect(text).toContain("common practice, no source");
  expect(text).toContain("3 samples must agree");
  // 1000 ms − 300 ms − 110 ms leave 590 ms for three samples.
  expect(text).toContain("from hazard to dark: 1 s; the slowest rate that meets it is 5.1 /s");
});

test("with a bench file, its own levels", () => {
  const bench = benchOf(changed(NORTH, "trip: 50 °C", "trip: 48 °C"));
  expect(plain(explain("case-over", bench).lines)).toContain("In the bench file of north");
  expect(plain(explain("case-over", bench).lines)).toContain("trips at 48.0 °C");
});

test("an unknown word is refused with the nearest one; words that objects have are unknown", () => {
  expect(explain("case-ovr", null)).toEqual({ lines: null, near: "case-over" });
  expect(explain("constructor", null).lines).toBeNull();
});
