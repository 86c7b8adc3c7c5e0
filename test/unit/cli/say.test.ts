import fc from "fast-check";
import { describe, expect, test } from "vitest";
import { wrapped } from "../../../daemon/cli/say.ts";
import { eventText } from "../../../daemon/cli/terminal.ts";
import { currentOf, durationOf, wholeOf } from "../../../daemon/cli/values.ts";

const SEED = 20261201;

describe("lines at a terminal", () => {
  test("are broken between words only, and what follows is indented", () => {
    expect(wrapped("north is dark and ready.", 12, "  ")).toBe("north is\n  dark and\n  ready.");
    expect(wrapped("short", 12, "")).toBe("short");
    expect(wrapped("see http://127.0.0.1:7808/sign now", 12, "")).toBe(
      "see\nhttp://127.0.0.1:7808/sign now",
    );
    expect(wrapped("any length", Number.POSITIVE_INFINITY, "")).toBe("any length");
  });

  test(`lose no word, and none is longer than it must be (seed ${SEED})`, () => {
    const words = fc.array(fc.stringMatching(/^[a-z]{1,12}$/), { minLength: 1, maxLength: 30 });
    fc.assert(
      fc.property(words, fc.integer({ min: 20, max: 60 }), (list, columns) => {
        const lines = wrapped(list.join(" "), columns, "    ").split("\n");
        expect(lines.join(" ").split(/ +/)).toEqual(list);
        for (const line of lines) expect(line.length).toBeLessThanOrEqual(columns);
      }),
      { seed: SEED },
    );
  });

  test("an event says when, and what it weighs where it is not calm", () => {
    const event = { id: 1, at: 0, kind: "trip", hazard: "key", words: "Dark: the key is off." };
    expect(eventText({ ...event, weight: "trip" })).toMatch(/^\d\d:\d\d:\d\d {2}trip {2}Dark: the/);
    expect(eventText({ ...event, weight: "calm" })).toMatch(/^\d\d:\d\d:\d\d {8}Dark: the/);
  });
});

describe("values of the command line", () => {
  test("a current needs its unit, and may come as two words", () => {
    expect(currentOf(["1.2", "A"])).toBe(1200);
    expect(currentOf(["900mA"])).toBe(900);
    for (const words of [["1.2"], ["1,2A"], ["1.2", "W"], [""]]) {
      expect(() => currentOf(words)).toThrow(/wanted a current with its unit/);
    }
  });

  test("a time is above zero and within bounds", () => {
    expect(durationOf("8h", 1e9)).toBe(28_800_000);
    for (const text of ["0 s", "-1 s", "9 h", "8"]) {
      expect(() => durationOf(text, 8 * 3_600_000)).toThrow(/wanted a time/);
    }
  });

  test("a whole number is written in plain digits", () => {
    expect(wholeOf("--port", "65535", 0, 65_535)).toBe(65_535);
    for (const text of ["65536", "-1", "1e3", "0x10", "", " 7", "7.0"]) {
      expect(() => wholeOf("--port", text, 0, 65_535)).toThrow("from 0 to 65535");
    }
  });
});
