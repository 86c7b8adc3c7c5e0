import { describe, expect, test } from "vitest";
import { LINTS } from "../../../daemon/bench-file/lints/catalogue.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { changed, NORTH } from "./files.ts";
import { CASES } from "./lint-cases.ts";

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
