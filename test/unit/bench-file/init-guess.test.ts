import { mkdtempSync, rmSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { afterEach, beforeEach, expect, test } from "vitest";
import { writeBench } from "../../../daemon/bench-file/init/write.ts";
import { parseBench } from "../../../daemon/bench-file/parse.ts";
import { toInit } from "../../../daemon/cli/init-answers.ts";
import { QUESTIONS } from "../../../daemon/cli/init-questions.ts";
import { readGuess } from "../../../daemon/cli/read-guess.ts";
import { guessStream } from "../../../daemon/link/plain/guess.ts";
import { pieceOf } from "../../../daemon/link/plain/piece.ts";

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), "beamsitter-guess-"));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const file = (value: unknown): string => {
  const path = join(folder, "guess.json");
  writeFileSync(path, typeof value === "string" ? value : JSON.stringify(value));
  return path;
};

/** What `listen --guess --json` prints of a board that prints a line ten times a second. */
function heard(): unknown {
  const lines = Array.from({ length: 40 }, (_, n) => ({
    line: `I=1.5${n % 10} T=31.${n % 7} PD=0.81${n % 5}`,
    at_ms: 100 * n,
  }));
  const guess = guessStream(lines);
  const { format, undecided } = guess;
  const columns = guess.columns.map(({ name, channel, unit, confidence }) => ({
    ...{ name, channel, unit, confidence },
  }));
  const piece = pieceOf(guess, { kind: "serial", path: "/dev/ttyUSB3", baud: 9600 });
  return { baud: 9600, format, columns, undecided, piece };
}

test("a guess of listen and a data sheet's first page make a bench file that passes check", () => {
  const { told, stream } = readGuess(file(heard()));
  expect(told).toMatchObject({ path: "/dev/ttyUSB3", baud: "9600 baud", thermistor: "" });
  const usual = Object.fromEntries(QUESTIONS.map(({ key, usual: value }) => [key, value ?? ""]));
  const sheet = { wavelength: "808 nm", threshold: "0.4 A", slope: "1.05 W/A" };
  const point = { current: "1.8 A", absolute: "2.2 A" };
  const text = writeBench(toInit({ ...usual, ...sheet, ...point, ...told }, stream), "schema");
  const parsed = parseBench(text);
  expect(parsed.problems.filter(({ level }) => level === "error")).toEqual([]);
  const columns = parsed.ok ? parsed.bench.controller.stream?.columns : undefined;
  expect(columns?.map(({ channel }) => channel)).toEqual(
    expect.arrayContaining(["current", "case"]),
  );
});

test("what is no guess is refused in words, and so is one that found nothing", () => {
  expect(() => readGuess(file("not JSON"))).toThrow("is no guess to begin from");
  expect(() => readGuess(file({ baud: 9600 }))).toThrow("listen --guess --json");
  const none = { ...(heard() as object), format: null, undecided: ["Only 2 lines came."] };
  expect(() => readGuess(file(none))).toThrow("Only 2 lines came.");
});
