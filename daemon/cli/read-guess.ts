import { Guessed } from "./answers.ts";
import { readBenchText } from "./bench-text.ts";
import type { Answers } from "./init-answers.ts";
import { EXIT, Trouble } from "./say.ts";

/** What `listen --guess --json` heard: answers of `init`, and how the numbers are read. */
export interface ReadGuess {
  readonly told: Answers;
  /** The key `stream` of section `controller`, line by line, not indented. */
  readonly stream: readonly string[];
}

/** Reads the file that `listen PORT --guess --json` was written into. Throws a Trouble. */
export function readGuess(file: string): ReadGuess {
  const guessed = Guessed.safeParse(jsonOf(readBenchText(file)));
  if (!guessed.success) throw noGuess(file, "It does not hold what listen --guess --json prints.");
  const { baud, format, piece, undecided } = guessed.data;
  if (format === null) {
    throw noGuess(file, undecided.join(" ") || "No format was found in what came.");
  }
  const lines = piece.split("\n");
  const from = lines.indexOf("  stream:");
  const stream = lines.slice(from).filter((line) => line !== "");
  if (from === -1) throw noGuess(file, "Its piece of bench file has no stream.");
  const told = {
    path: /path: ([^\s,}]+)/.exec(piece)?.[1] ?? "",
    baud: `${baud} baud`,
    board: "any",
    rate: /^ {2}rate: (.+)$/m.exec(piece)?.[1] ?? "10 /s",
    // The stream's columns say what case and light are measured in.
    thermistor: "",
    photodiode: "",
  };
  return { told, stream: stream.map((line) => line.slice(2)) };
}

function jsonOf(text: string): unknown {
  try {
    return JSON.parse(text);
  } catch {
    // Told by whoever asked: it is no guess.
    return null;
  }
}

const noGuess = (file: string, why: string): Trouble =>
  new Trouble(
    `${file} is no guess to begin from. ${why}`,
    "Write one with: beamsitter listen PORT --guess --json. Nothing was written.",
    EXIT.refused,
  );
