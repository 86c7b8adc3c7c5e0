import { describe, expect, test } from "vitest";
import { seal } from "../../../firmware-protocol/line.ts";
import { readManifest } from "../../../firmware-protocol/manifest.ts";
import { CHANNEL_BODIES, INTRODUCTION, introductionOf } from "./introduction.ts";

const problemsOf = (lines: readonly string[]): string => {
  const result = readManifest(lines);
  return result.kind === "manifest" ? "none" : result.problems.join("; ");
};
const changed = (place: number, body: string): string[] =>
  introductionOf(
    {},
    CHANNEL_BODIES.map((b, i) => (i === place ? body : b)),
  );

describe("manifest", () => {
  test("a whole introduction", () => {
    const result = readManifest(INTRODUCTION);
    expect(result.kind).toBe("manifest");
    if (result.kind !== "manifest") return;
    const { manifest } = result;
    expect(manifest.firmware).toBe("bs-test-1");
    expect(manifest.capabilities).toEqual(["hand", "toggle"]);
    expect(manifest.channels).toHaveLength(6);
    expect(manifest.channels[5]).toEqual({
      index: 5,
      name: "supply",
      unit: "mV",
      perCount: 25,
      count_min: 0,
      count_max: 1023,
      group: 1,
    });
    expect(manifest.id).toBe(INTRODUCTION.at(-1)?.split(" ")[2]);
  });

  test.each([
    [
      "a required channel is missing",
      introductionOf({}, CHANNEL_BODIES.slice(0, 3)),
      /photodiode is missing/,
    ],
    [
      "a judged channel in a slow group",
      changed(2, "<channel 2 case adc 1e0 0 1023 1"),
      /case is in group 1/,
    ],
    [
      "a name twice",
      changed(4, "<channel 4 case adc 1e0 0 1023 1"),
      /a name that an earlier channel has/,
    ],
    ["indexes out of order", changed(4, "<channel 5 sink adc 1e0 0 1023 1"), /place 4/],
    ["bounds the wrong way round", changed(4, "<channel 4 sink adc 1e0 9 9 1"), /not below/],
    ["a scale of zero", changed(4, "<channel 4 sink adc 0e0 0 1023 1"), /scale of zero/],
    [
      "terms the wrong way round",
      introductionOf({ termMin: "600", termMax: "500" }),
      /above the longest/,
    ],
    ["no samples offered", introductionOf({ rate: "0" }), /rate is 0/],
    ["a channel line lost", INTRODUCTION.filter((_, i) => i !== 3), /6 channels were told, 5 came/],
    [
      "a channel line doubled",
      [...INTRODUCTION.slice(0, 3), ...INTRODUCTION.slice(2)],
      /6 channels were told, 7 came/,
    ],
    ["another sum", [...INTRODUCTION.slice(0, -1), seal("<end 6 00000000")], /sum to/],
    ["no end", INTRODUCTION.slice(0, -1), /no end line/],
    ["no hello", INTRODUCTION.slice(1), /no hello/],
    ["another version", [seal("<hello 2 x"), ...INTRODUCTION.slice(1)], /speaks version 2/],
    [
      "a garbled line",
      INTRODUCTION.map((line, i) => (i === 2 ? line.replace("mA", "mB") : line)),
      /is broken \(crc\)/,
    ],
    [
      "samples that no line can hold",
      introductionOf({}, [
        ...CHANNEL_BODIES,
        ...Array.from(
          { length: 9 },
          (_, i) => `<channel ${i + 6} extra${i} adc 1e0 -2147483648 0 1`,
        ),
      ]),
      /a line holds 160/,
    ],
  ])("%s", (_, lines, wanted) => {
    expect(problemsOf(lines)).toMatch(wanted);
  });

  test("all problems are named at once", () => {
    const lines = introductionOf({ rate: "0", termMin: "0" }, CHANNEL_BODIES.slice(1, 3));
    const problems = problemsOf(lines).split("; ");
    expect(problems.length).toBeGreaterThanOrEqual(6);
  });

  test("a torn first try does no harm: the next hello starts over", () => {
    expect(problemsOf([...INTRODUCTION.slice(0, 4), ...INTRODUCTION])).toBe("none");
  });
});
