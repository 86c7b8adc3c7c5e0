import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { BENCH_BYTES_MAX, parseBench } from "../../../daemon/bench-file/parse.ts";
import { BARE_DIODE, changed, NORTH } from "./files.ts";

const seed = 20261201;

/** A bench whose controller has firmware of its own, with an instrument beside it. */
const WATCHED = `${changed(
  BARE_DIODE,
  "  term: 500 ms\n",
  `  term: 500 ms
  stream:
    format: labelled
    columns:
      current: { from: I, unit: A }
      case: { from: T, unit: "°C" }
  cut-off: { kind: text, send: "off", expect: "ok" }
`,
)}witness:
  meter: { address: "tcp://192.168.1.30:5025", query: "MEAS:POW?", due: 2027-03-01 }
`;

/** Refused with that code as first problem, at a place in the text. */
function refused(text: string, code: string): void {
  const parsed = parseBench(text);
  expect(parsed.ok).toBe(false);
  expect(parsed.problems[0]).toMatchObject({ level: "error", code });
  expectPlaces(text, parsed);
}

function expectPlaces(text: string, parsed = parseBench(text)): void {
  const lines = text.split("\n");
  for (const { line, column, found, wanted, do: advice } of parsed.problems) {
    expect(line).toBeGreaterThanOrEqual(1);
    expect(line).toBeLessThanOrEqual(lines.length);
    expect(column).toBeGreaterThanOrEqual(1);
    for (const words of [found, wanted, advice]) expect(words).not.toBe("");
  }
}

describe("files that are no bench file", () => {
  test("empty, or only blank", () => {
    refused("", "empty");
    refused(" \n\t\n", "empty");
  });
  test("only comments", () => refused("# nothing here\n", "shape"));
  test("binary", () => {
    refused("\u007fELF\u0002\u0001\u0000", "binary");
    refused(`${NORTH}\u0000`, "binary");
    refused("bench: \ufffd\ufffd", "binary");
  });
  test("larger than any bench file, at once", () => {
    refused("a".repeat(BENCH_BYTES_MAX + 1), "too-large");
  });
  test("a hundred megabytes, without being parsed", () => {
    expect(parseBench("x: y\n".repeat(20_000_000)).problems).toMatchObject([{ code: "too-large" }]);
  });
  test("aliases that would grow to billions of values", () => {
    const bomb = ["a: &a [x, x, x, x, x, x, x, x, x]"];
    for (const letter of "bcdefghij") {
      const before = String.fromCharCode(letter.charCodeAt(0) - 1);
      bomb.push(`${letter}: &${letter} [${`*${before}, `.repeat(8)}*${before}]`);
    }
    refused(bomb.join("\n"), "alias");
  });
  test.each([
    ["brackets", "[".repeat(8000)],
    ["closed brackets", `${"[".repeat(5000)}${"]".repeat(5000)}`],
    ["dashes", `${"- ".repeat(8000)}x`],
    ["braces", "{a: ".repeat(4000)],
    ["question marks", `${"? ".repeat(4000)}x`],
  ])("deep nesting of %s", (_name, text) => {
    const parsed = parseBench(text);
    expect(parsed.ok).toBe(false);
    expectPlaces(text, parsed);
  });
  test("two documents, a key twice, a tab, a tag, a merge key", () => {
    refused(`${NORTH}\n---\n${NORTH}`, "yaml");
    refused(`${NORTH}\nbench: south\n`, "yaml");
    refused("bench: x\nlimits:\n\tcurrent: 1 A\n", "yaml");
    refused("bench: !secret x\n", "yaml");
    refused("a: &x {b: c}\nd:\n  <<: *x\n", "alias");
  });
  test("a list, a word, a number", () => {
    for (const text of ["- a\n- b\n", "hello", "42"]) refused(text, "shape");
  });
  test("keys that objects have by nature", () => {
    for (const key of ["__proto__", "constructor", "toString", "hasOwnProperty"]) {
      const parsed = parseBench(`${NORTH}\n${key}: {x: y}\n`);
      expect(parsed.ok).toBe(false);
      expect(parsed.problems[0]).toMatchObject({ code: "unknown-key", path: key });
    }
  });
});

test("a byte order mark and Windows line ends are fine", () => {
  expect(parseBench(`\ufeff${NORTH.replaceAll("\n", "\r\n")}`).ok).toBe(true);
});

describe(`whatever the text, no throw and every problem has a place (seed ${seed})`, () => {
  test("random text", () => {
    fc.assert(
      fc.property(fc.string({ unit: "binary", maxLength: 400 }), (text) => expectPlaces(text)),
      { seed, numRuns: 400 },
    );
  });
  test("random YAML", () => {
    const word = fc.constantFrom("bench", "limits", "a", "1.8 A", "45", "~", "'", "yes", "°");
    const mark = fc.constantFrom(
      ": ",
      "\n",
      "  ",
      "- ",
      "{",
      "}",
      "[",
      "]",
      ",",
      "#",
      "|",
      "&a ",
      "*a",
      "?",
      "!",
      "%",
    );
    const text = fc.array(fc.oneof(word, mark), { maxLength: 60 }).map((parts) => parts.join(""));
    fc.assert(
      fc.property(text, (made) => expectPlaces(made)),
      { seed, numRuns: 400 },
    );
  });
  test.each([
    ["north", NORTH],
    ["a bench with streams and instruments", WATCHED],
  ])("%s with passages cut, doubled, swapped or overwritten", (_name, whole) => {
    const place = fc.nat({ max: whole.length });
    const edit = fc.record({
      from: place,
      length: fc.nat({ max: 40 }),
      text: fc.oneof(
        fc.constantFrom("", ":", "\n", "  ", "9", "-", "A", "K", "none", "1e9", "{", "'"),
        fc.string({ maxLength: 8 }),
        place.map((at) => whole.slice(at, at + 30)),
      ),
    });
    fc.assert(
      fc.property(fc.array(edit, { minLength: 1, maxLength: 4 }), (edits) => {
        let text = whole;
        for (const { from, length, text: put } of edits) {
          text = text.slice(0, from) + put + text.slice(from + length);
        }
        expectPlaces(text);
      }),
      { seed, numRuns: 150 },
    );
  });
});
