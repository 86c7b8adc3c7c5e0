import { closeSync, constants, fstatSync, openSync, readFileSync } from "node:fs";
import { fileURLToPath } from "node:url";
import { BENCH_BYTES_MAX, parseBench } from "../bench-file/parse.ts";
import { problemLines } from "../bench-file/report.ts";
import type { Bench } from "../model/bench.ts";
import { assetFile } from "../paths.ts";
import { codeOf, EXIT, reasonOf, Trouble } from "./say.ts";

/** The built-in bench's own file. */
export const NORTH = assetFile("daemon/bench-file/benches/north.yaml");

/** Reads a bench file's text; a folder, a pipe, a missing or a huge file is refused in words. */
export function readBenchText(path: string | URL): string {
  const name = typeof path === "string" ? path : fileURLToPath(path);
  let handle: number;
  try {
    // A pipe that nobody writes to would hold an ordinary open for ever.
    handle = openSync(path, constants.O_RDONLY | constants.O_NONBLOCK);
  } catch (error) {
    throw new Trouble(whyUnreadable(name, error), "Name a readable bench file.");
  }
  try {
    const info = fstatSync(handle);
    if (info.isDirectory()) {
      throw new Trouble(`${name} is a folder.`, "Name the bench file in it.");
    }
    if (!info.isFile()) {
      throw new Trouble(`${name} is a device or a pipe, no file.`, "Save it as a file first.");
    }
    if (info.size > BENCH_BYTES_MAX) {
      throw new Trouble(
        `${name} has ${info.size} bytes; a bench file has at most ${BENCH_BYTES_MAX}.`,
        "Name the bench file itself; recordings and pictures belong elsewhere.",
      );
    }
    return readFileSync(handle, "utf8");
  } finally {
    closeSync(handle);
  }
}

function whyUnreadable(path: string, error: unknown): string {
  const code = codeOf(error);
  if (code === "ENOENT") return `There is no file ${path}.`;
  if (code === "EACCES") return `${path} may not be read by this user.`;
  return `${path} cannot be read: ${reasonOf(error)}.`;
}

/** The bench of a file, or a Trouble that lists everything wrong with it. */
export function loadBench(path: string | URL): {
  bench: Bench;
  text: string;
  /** How many things in it could be bettered. */
  hints: number;
} {
  const text = readBenchText(path);
  const parsed = parseBench(text);
  if (parsed.ok) return { bench: parsed.bench, text, hints: parsed.problems.length };
  throw new Trouble(
    problemLines(parsed.problems, String(path)).join("\n"),
    `Mend the file, then: beamsitter check ${path}. Nothing was started.`,
    EXIT.refused,
  );
}
